/**
 * Range: highest minus lowest balance. In: dB, string 1 first. Out: dB; null when a value is missing or not finite,
 * because a range of fewer strings is another reading.
 *
 * @example rangeDb([0, 1, -1, 0, 0, 2]) // 3
 */
export function rangeDb(balancesDb: readonly (number | null)[]): number | null {
  let high = -Infinity
  let low = Infinity
  for (const balance of balancesDb) {
    if (balance === null || !Number.isFinite(balance)) return null
    if (balance > high) high = balance
    if (balance < low) low = balance
  }
  return balancesDb.length === 0 ? null : high - low
}

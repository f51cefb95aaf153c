/**
 * Step: largest difference between neighbouring strings. In: balances in dB, string 1 first. Out: dB; null when a
 * value is missing or not finite or there are fewer than two.
 *
 * @example stepDb([0, 1, -1, 0, 0, 2]) // 2
 */
export function stepDb(balancesDb: readonly (number | null)[]): number | null {
  let step = 0
  for (let i = 0; i < balancesDb.length; i++) {
    const balance = balancesDb[i]
    if (balance === null || balance === undefined || !Number.isFinite(balance)) return null
    if (i > 0) step = Math.max(step, Math.abs(balance - balancesDb[i - 1]!))
  }
  return balancesDb.length < 2 ? null : step
}

/**
 * Energy mean of levels: 10 lg(mean 10^(L/10)). In: dB, -Infinity counts as power 0. Out: dB, -Infinity when all
 * are silent; null when there is none or one of them is NaN or +Infinity.
 *
 * @example meanPowerDb([-20, -20, -Infinity]) // -21.76...
 */
export function meanPowerDb(levelsDb: readonly number[]): number | null {
  if (levelsDb.length === 0) return null
  let power = 0
  for (const levelDb of levelsDb) power += Math.pow(10, levelDb / 10)
  return Number.isFinite(power) ? dbOfPower(power / levelsDb.length) : null
}

/** Level of a power: 10 lg P. In: power re (1 V)^2. Out: dBV; 0 gives -Infinity, a negative or NaN power NaN. */
export function dbOfPower(power: number): number {
  return 10 * Math.log10(power)
}

/**
 * Arithmetic mean, in two passes so that a large common part costs no digits. Any unit. null for no values; a
 * value that is not finite makes the mean not finite.
 *
 * @example meanOf([1, 2, 6]) // 3
 */
export function meanOf(values: readonly number[]): number | null {
  if (values.length === 0) return null
  let sum = 0
  for (const value of values) sum += value
  const first = sum / values.length
  if (!Number.isFinite(first)) return first
  let rest = 0
  for (const value of values) rest += value - first
  return first + rest / values.length
}

/**
 * Median: the middle value, or the mean of the two middle ones. Any unit. -Infinity sorts lowest; NaN is left out;
 * null when nothing is left.
 *
 * @example medianOf([3, 1, 2, 10]) // 2.5
 */
export function medianOf(values: readonly number[]): number | null {
  const sorted = values.filter((value) => !Number.isNaN(value)).sort((a, b) => a - b)
  if (sorted.length === 0) return null
  const upper = sorted.length >> 1
  if (sorted.length % 2 === 1) return sorted[upper]!
  const low = sorted[upper - 1]!
  const high = sorted[upper]!
  return low === high ? low : (low + high) / 2
}

import { meanOf } from './meanOf.ts'

/**
 * Sample standard deviation, divisor n - 1, in two passes with the correction for the mean's rounding. Unit of the
 * values. null for fewer than two values; a value that is not finite gives NaN.
 *
 * @example sampleSd([-1, 0, 1]) // 1
 */
export function sampleSd(values: readonly number[]): number | null {
  if (values.length < 2) return null
  const mean = meanOf(values)!
  let squares = 0
  let rest = 0
  for (const value of values) {
    const deviation = value - mean
    squares += deviation * deviation
    rest += deviation
  }
  return Math.sqrt((squares - (rest * rest) / values.length) / (values.length - 1))
}

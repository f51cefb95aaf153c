import jStat from 'jstat'
import { tProbability } from './tProbability.ts'

/** Probability that a t (dof null: normal) variable is at most z. */
function probabilityBelow(z: number, dof: number | null): number {
  if (z === Infinity) return 1
  if (z === -Infinity) return 0
  return dof === null ? jStat.normal.cdf(z, 0, 1) : tProbability(z, dof)
}

/**
 * Probability that the true value lies inside the limits, given the reading and its standard uncertainty (JCGM 106,
 * 7): F((high - y)/u) - F((low - y)/u), F normal, or Student's t for finite degrees of freedom. A limit of null is
 * none. u = 0 gives 1 or 0. null when y or u is missing or not finite.
 *
 * @example conformProbability(9.8, 0.1, null, 9, 10) // 0.977...
 */
export function conformProbability(
  value: number | null,
  u: number | null,
  dof: number | null,
  low: number | null,
  high: number | null,
): number | null {
  if (value === null || u === null || !Number.isFinite(value) || !Number.isFinite(u) || u < 0) return null
  const bottom = low ?? -Infinity
  const top = high ?? Infinity
  if (u === 0) return value >= bottom && value <= top ? 1 : 0
  const probability = probabilityBelow((top - value) / u, dof) - probabilityBelow((bottom - value) / u, dof)
  return Math.min(1, Math.max(0, probability))
}

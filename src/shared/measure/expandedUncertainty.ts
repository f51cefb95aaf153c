import { COVERAGE } from './constants.ts'
import { tQuantile } from './tQuantile.ts'

/**
 * Expanded uncertainty U = t_95 u (JCGM 100, 6.2 and G.3). Effective degrees of freedom are cut to a whole number
 * first, at least 1 (JCGM 100, G.4.1); null is infinite. Sides as the rule is: two for an interval, one for a single
 * limit. In and out: the reading's unit; null when u is null or not finite.
 *
 * @example expandedUncertainty(1, 16, 2) // 2.12
 */
export function expandedUncertainty(u: number | null, dof: number | null, sides: 1 | 2): number | null {
  if (u === null || !Number.isFinite(u)) return null
  const whole = dof === null ? null : Math.max(1, Math.floor(dof))
  const expanded = u * tQuantile(sides === 2 ? (1 + COVERAGE) / 2 : COVERAGE, whole)
  return Number.isFinite(expanded) ? expanded : null
}

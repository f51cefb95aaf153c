import jStat from 'jstat'
import { tDensity, tProbability } from './tProbability.ts'

/**
 * Quantile of Student's t, of the normal for infinite degrees of freedom (null). In: probability, degrees of freedom
 * (whole or not). jStat's inverse with two Newton steps on its distribution function is good to seven digits. For the
 * rest, from 200 degrees of freedom on, where jStat loses its digits, the expansion about the normal quantile
 * (Abramowitz and Stegun, 26.7.5, from memory) is good to ten digits. NaN for a probability outside 0..1 or degrees of freedom not above 0.
 *
 * @example tQuantile(0.975, 16) // 2.1199...
 */
export function tQuantile(probability: number, dof: number | null): number {
  if (!(probability > 0 && probability < 1) || (dof !== null && !(dof > 0))) return NaN
  if (dof === null || dof === Infinity) return jStat.normal.inv(probability, 0, 1)
  if (probability < 0.5) return -tQuantile(1 - probability, dof)
  if (dof >= EXPANSION_FROM_DOF) {
    const z = jStat.normal.inv(probability, 0, 1)
    const g1 = (z ** 3 + z) / 4
    const g2 = (5 * z ** 5 + 16 * z ** 3 + 3 * z) / 96
    const g3 = (3 * z ** 7 + 19 * z ** 5 + 17 * z ** 3 - 15 * z) / 384
    const g4 = (79 * z ** 9 + 776 * z ** 7 + 1482 * z ** 5 - 1920 * z ** 3 - 945 * z) / 92_160
    return z + g1 / dof + g2 / dof ** 2 + g3 / dof ** 3 + g4 / dof ** 4
  }
  let t = jStat.studentt.inv(probability, dof)
  for (let step = 0; step < 2; step++) {
    t -= (tProbability(t, dof) - probability) / tDensity(t, dof)
  }
  return t
}

const EXPANSION_FROM_DOF = 200

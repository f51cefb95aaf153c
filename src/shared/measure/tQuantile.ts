import jStat from 'jstat'

/**
 * Quantile of Student's t, of the normal for infinite degrees of freedom (null). In: probability, degrees of freedom
 * (whole or not). jStat's inverse is good to eight digits; two Newton steps on its distribution function give the
 * rest. NaN for a probability outside 0..1 or degrees of freedom not above 0.
 *
 * @example tQuantile(0.975, 16) // 2.1199...
 */
export function tQuantile(probability: number, dof: number | null): number {
  if (!(probability > 0 && probability < 1) || (dof !== null && !(dof > 0))) return NaN
  if (dof === null || dof === Infinity) return jStat.normal.inv(probability, 0, 1)
  if (probability < 0.5) return -tQuantile(1 - probability, dof)
  let t = jStat.studentt.inv(probability, dof)
  for (let step = 0; step < 2; step++) {
    t -= (jStat.studentt.cdf(t, dof) - probability) / jStat.studentt.pdf(t, dof)
  }
  return t
}

import jStat from 'jstat'

/**
 * Probability that a variable of Student's t is at most t: 1 - I_x(dof/2, 1/2) / 2 with x = dof / (dof + t^2), for
 * t >= 0 (Abramowitz and Stegun 26.7.1). Own continued fraction, because jStat's stops at nine digits. In: t, degrees
 * of freedom (whole or not). NaN for degrees of freedom not above 0 or a NaN.
 *
 * @example tProbability(0, 5) // 0.5
 */
export function tProbability(t: number, dof: number): number {
  if (!(dof > 0) || Number.isNaN(t)) return NaN
  if (Math.abs(t) === Infinity) return t > 0 ? 1 : 0
  const square = t * t
  // the smaller of the two arguments keeps its digits
  const tail =
    square > dof
      ? incompleteBeta(dof / (dof + square), dof / 2, 0.5)
      : 1 - incompleteBeta(square / (dof + square), 0.5, dof / 2)
  return t > 0 ? 1 - tail / 2 : tail / 2
}

/** Density of Student's t at t. */
export function tDensity(t: number, dof: number): number {
  const scale = jStat.gammaln((dof + 1) / 2) - jStat.gammaln(dof / 2)
  return Math.exp(scale - ((dof + 1) / 2) * Math.log1p((t * t) / dof)) / Math.sqrt(dof * Math.PI)
}

/** Regularised incomplete beta function I_x(a, b), 0 <= x <= 1. */
function incompleteBeta(x: number, a: number, b: number): number {
  if (x <= 0) return 0
  if (x >= 1) return 1
  if (x > (a + 1) / (a + b + 2)) return 1 - incompleteBeta(1 - x, b, a)
  const front =
    jStat.gammaln(a + b) - jStat.gammaln(a) - jStat.gammaln(b) + a * Math.log(x) + b * Math.log1p(-x)
  return (Math.exp(front) / a) * betaFraction(x, a, b)
}

const ENOUGH = 1e-16
const MOST_STEPS = 500

/** Continued fraction of the incomplete beta function (Abramowitz and Stegun 26.5.8), by the modified Lentz method. */
function betaFraction(x: number, a: number, b: number): number {
  let d = 1 / (1 - ((a + b) * x) / (a + 1))
  let c = 1
  let value = d
  for (let m = 1; m <= MOST_STEPS; m++) {
    const even = (m * (b - m) * x) / ((a + 2 * m - 1) * (a + 2 * m))
    d = 1 / (1 + even * d)
    c = 1 + even / c
    value *= d * c
    const odd = (-(a + m) * (a + b + m) * x) / ((a + 2 * m) * (a + 2 * m + 1))
    d = 1 / (1 + odd * d)
    c = 1 + odd / c
    value *= d * c
    if (Math.abs(d * c - 1) < ENOUGH) break
  }
  return value
}

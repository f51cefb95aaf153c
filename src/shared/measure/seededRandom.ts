/**
 * Small seeded generator (mulberry32: a 32-bit counter, mixed): the same seed gives the same numbers on every
 * machine. Out: 0 <= x < 1. For simulations, not for secrets.
 *
 * @example seededRandom(1)() === seededRandom(1)() // true
 */
export function seededRandom(seed: number): () => number {
  let counter = seed >>> 0
  return () => {
    counter = (counter + 0x6d2b79f5) >>> 0
    let mixed = Math.imul(counter ^ (counter >>> 15), counter | 1)
    mixed ^= mixed + Math.imul(mixed ^ (mixed >>> 7), mixed | 61)
    return ((mixed ^ (mixed >>> 14)) >>> 0) / 4_294_967_296
  }
}

/** Standard normal numbers out of a uniform generator, by the polar method (Marsaglia and Bray 1964). */
export function normalFrom(random: () => number): () => number {
  let spare: number | null = null
  return () => {
    if (spare !== null) {
      const kept = spare
      spare = null
      return kept
    }
    for (;;) {
      const x = 2 * random() - 1
      const y = 2 * random() - 1
      const radius = x * x + y * y
      if (radius >= 1 || radius === 0) continue
      const factor = Math.sqrt((-2 * Math.log(radius)) / radius)
      spare = y * factor
      return x * factor
    }
  }
}

/**
 * One chi-square number with `dof` degrees of freedom (Marsaglia and Tsang 2000, gamma of shape dof/2; dof at
 * least 1, smaller is taken as 1).
 */
export function chiSquareFrom(normal: () => number, random: () => number, dof: number): number {
  const shape = Math.max(1, dof) / 2
  const lift = shape < 1 ? Math.pow(1 - random(), 1 / shape) : 1
  const d = (shape < 1 ? shape + 1 : shape) - 1 / 3
  const c = 1 / Math.sqrt(9 * d)
  for (;;) {
    const x = normal()
    const v = Math.pow(1 + c * x, 3)
    if (v > 0 && Math.log(1 - random()) < 0.5 * x * x + d - d * v + d * Math.log(v)) return 2 * d * v * lift
  }
}

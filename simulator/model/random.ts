/** A seeded source of random numbers: the same seed and the same order of calls give the same numbers. */
export interface Random {
  /** uniform, 0 <= x < 1 */
  uniform(): number
  /** normal with mean 0 and standard deviation 1 */
  normal(): number
  /** exponential waiting time with the mean that is given */
  exponential(mean: number): number
  /** normal, cut off at so many standard deviations on either side */
  normalWithin(limit: number): number
}

/**
 * Small fast counting generator (sfc32, public domain), seeded by a number and a name, so that each part of the
 * model has a stream of its own and one more draw in one part moves no other.
 */
export function makeRandom(seed: number, stream: string): Random {
  let a = hash(stream, seed >>> 0)
  let b = hash(stream, (seed ^ 0x9e3779b9) >>> 0)
  let c = hash(stream, (seed ^ 0x85ebca6b) >>> 0)
  let counter = 1
  let spare = Number.NaN

  function next(): number {
    const sum = (((a + b) | 0) + counter) | 0
    counter = (counter + 1) | 0
    a = b ^ (b >>> 9)
    b = (c + (c << 3)) | 0
    c = (c << 21) | (c >>> 11)
    c = (c + sum) | 0
    return sum >>> 0
  }
  for (let i = 0; i < 12; i++) next()

  function uniform(): number {
    return next() / 4_294_967_296
  }

  function normal(): number {
    if (!Number.isNaN(spare)) {
      const value = spare
      spare = Number.NaN
      return value
    }
    // polar method of Marsaglia
    for (;;) {
      const x = 2 * uniform() - 1
      const y = 2 * uniform() - 1
      const square = x * x + y * y
      if (square > 0 && square < 1) {
        const factor = Math.sqrt((-2 * Math.log(square)) / square)
        spare = y * factor
        return x * factor
      }
    }
  }

  return {
    uniform,
    normal,
    exponential: (mean) => -mean * Math.log(1 - uniform()),
    normalWithin(limit) {
      for (;;) {
        const value = normal()
        if (Math.abs(value) <= limit) return value
      }
    },
  }
}

/** FNV-1a with a final mix: spreads a name and a number over 32 bits. */
function hash(text: string, start: number): number {
  let value = (2166136261 ^ start) >>> 0
  for (let i = 0; i < text.length; i++) value = Math.imul(value ^ text.charCodeAt(i), 16777619)
  value = Math.imul(value ^ (value >>> 16), 0x21f0aaad)
  value = Math.imul(value ^ (value >>> 15), 0x735a2d97)
  return (value ^ (value >>> 15)) >>> 0
}

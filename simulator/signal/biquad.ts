/** Second-order section, a0 = 1. */
export interface Biquad {
  b0: number
  b1: number
  b2: number
  a1: number
  a2: number
}

/** Below this a filter's memory is nothing; left alone it would decay into denormal numbers, which are slow. */
const NOTHING = 1e-60

/** Second-order sections one after the other, with their memory (transposed direct form II). */
export class BiquadCascade {
  private readonly sections: readonly Biquad[]
  private readonly memory: Float64Array

  constructor(sections: readonly Biquad[]) {
    this.sections = sections
    this.memory = new Float64Array(sections.length * 2)
  }

  /** Filters `count` samples in place. */
  process(samples: Float64Array, count: number): void {
    for (let s = 0; s < this.sections.length; s++) {
      const { b0, b1, b2, a1, a2 } = this.sections[s]!
      let z1 = this.memory[2 * s]!
      let z2 = this.memory[2 * s + 1]!
      for (let i = 0; i < count; i++) {
        const x = samples[i]!
        const y = b0 * x + z1
        z1 = b1 * x - a1 * y + z2
        z2 = b2 * x - a2 * y
        samples[i] = y
      }
      this.memory[2 * s] = Math.abs(z1) < NOTHING ? 0 : z1
      this.memory[2 * s + 1] = Math.abs(z2) < NOTHING ? 0 : z2
    }
  }

  reset(): void {
    this.memory.fill(0)
  }
}

/** Gain of sections at a frequency, in dB. */
export function gainDb(sections: readonly Biquad[], hz: number, rateHz: number): number {
  const w = (2 * Math.PI * hz) / rateHz
  const [c1, s1, c2, s2] = [Math.cos(w), Math.sin(w), Math.cos(2 * w), Math.sin(2 * w)]
  let gain = 0
  for (const { b0, b1, b2, a1, a2 } of sections) {
    const above = (b0 + b1 * c1 + b2 * c2) ** 2 + (b1 * s1 + b2 * s2) ** 2
    const below = (1 + a1 * c1 + a2 * c2) ** 2 + (a1 * s1 + a2 * s2) ** 2
    gain += 10 * Math.log10(above / below)
  }
  return gain
}

/**
 * Bilinear transform of (n2 s^2 + n1 s + n0) / (d2 s^2 + d1 s + d0), s in rad/s. Frequencies are not prewarped:
 * the caller warps its corner if the corner matters.
 */
export function bilinear(
  [n2, n1, n0]: readonly [number, number, number],
  [d2, d1, d0]: readonly [number, number, number],
  rateHz: number,
): Biquad {
  const k = 2 * rateHz
  const a0 = d2 * k * k + d1 * k + d0
  return {
    b0: (n2 * k * k + n1 * k + n0) / a0,
    b1: (2 * n0 - 2 * n2 * k * k) / a0,
    b2: (n2 * k * k - n1 * k + n0) / a0,
    a1: (2 * d0 - 2 * d2 * k * k) / a0,
    a2: (d2 * k * k - d1 * k + d0) / a0,
  }
}

/** The analog angular frequency that the bilinear transform lays onto `hz`, rad/s. */
export function warped(hz: number, rateHz: number): number {
  return 2 * rateHz * Math.tan((Math.PI * hz) / rateHz)
}

/**
 * Chebyshev low-pass (type I) of even order, 0 dB at 0 Hz, so that its ripple lies above 0 dB; the corner is where
 * the ripple ends.
 */
export function chebyshevLowPass(
  cornerHz: number,
  order: number,
  rippleDb: number,
  rateHz: number,
): Biquad[] {
  const corner = warped(cornerHz, rateHz)
  const mu = Math.asinh(1 / Math.sqrt(10 ** (rippleDb / 10) - 1)) / order
  return Array.from({ length: order / 2 }, (_, pair) => {
    const angle = (Math.PI * (2 * pair + 1)) / (2 * order)
    const real = -Math.sinh(mu) * Math.sin(angle) * corner
    const imaginary = Math.cosh(mu) * Math.cos(angle) * corner
    const square = real * real + imaginary * imaginary
    return bilinear([0, 0, square], [1, -2 * real, square], rateHz)
  })
}

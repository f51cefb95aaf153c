/** Repeatable numbers spread evenly over 0..1 (linear congruence of 32 bits, Numerical Recipes). */
export function evenNumbers(seed: number): () => number {
  let state = seed >>> 0
  return () => {
    state = (Math.imul(state, 1_664_525) + 1_013_904_223) >>> 0
    return state / 2 ** 32
  }
}

/** Gaussian white noise with this rms. */
export function whiteNoise(count: number, rms: number, seed: number): Float64Array {
  const even = evenNumbers(seed)
  return Float64Array.from(
    { length: count },
    () => rms * Math.sqrt(-2 * Math.log(1 - even())) * Math.cos(2 * Math.PI * even()),
  )
}

export function sine(count: number, hz: number, rateHz: number, peak: number): Float64Array {
  return Float64Array.from({ length: count }, (_, i) => peak * Math.sin((2 * Math.PI * hz * i) / rateHz))
}

export function sumOf(...signals: readonly Float64Array[]): Float64Array {
  return Float64Array.from(signals[0]!, (_, i) => signals.reduce((sum, signal) => sum + signal[i]!, 0))
}

export function rmsOf(samples: Float64Array): number {
  return Math.sqrt(samples.reduce((sum, x) => sum + x * x, 0) / samples.length)
}

export function rmsDb(samples: Float64Array): number {
  return 20 * Math.log10(rmsOf(samples))
}

export interface StringTone {
  hz: number
  /** part of the string from the saddle at which it is plucked */
  pluckedAt?: number
  /** amplitude time constant of the fundamental, s; partial n dies n^0.5 times as fast */
  tauS?: number
  /** stiffness: partial n lies at n f sqrt(1 + B n^2) */
  stiffness?: number
  peak?: number
}

/** A plucked string as a sum of decaying partials: amplitudes sin(n pi p) / n of an ideal string. */
export function stringTone(count: number, rateHz: number, tone: StringTone): Float64Array {
  const { hz, pluckedAt = 0.13, tauS = 1, stiffness = 5e-5, peak = 0.1 } = tone
  const out = new Float64Array(count)
  for (let n = 1; n <= 30 && n * hz < 8000; n++) {
    const amplitude = (peak * Math.sin(n * Math.PI * pluckedAt)) / n
    const own = n * hz * Math.sqrt(1 + stiffness * n * n)
    const decay = Math.sqrt(n) / tauS / rateHz
    for (let i = 0; i < count; i++)
      out[i] = out[i]! + amplitude * Math.exp(-i * decay) * Math.sin((2 * Math.PI * own * i) / rateHz + n)
  }
  return out
}

import { BiquadCascade, chebyshevLowPass } from './biquad.ts'
import { noiseScale, powerSpectrum } from './spectrum.ts'
import type { Spectrum } from './spectrum.ts'

/** Name and version of this way to measure hum; kept with every run. */
export const HUM_ALGORITHM = 'harmonic-lines-1'

const HIGHEST_HZ = 1000
/** The mains wanders; its harmonics wander that many times as far. */
const MAINS_TOLERANCE_HZ = 0.4
const DECIMATED_HZ = 4000

/** Takes a channel down to about 4 kHz, so that seconds of it can be kept and transformed cheaply. */
export class HumDecimator {
  readonly rateHz: number
  private readonly filter: BiquadCascade
  private readonly factor: number
  private readonly work: Float64Array
  private skip = 0

  constructor(rateHz: number, longestFrame: number) {
    this.factor = Math.floor(rateHz / DECIMATED_HZ)
    this.rateHz = rateHz / this.factor
    this.filter = new BiquadCascade(chebyshevLowPass(1200, 8, 0.02, rateHz))
    this.work = new Float64Array(longestFrame)
  }

  /** Filters a frame and gives back every n-th sample of it, in the front of the array. */
  take(samples: Float64Array, count: number): { samples: Float64Array; count: number } {
    for (let i = 0; i < count; i++) this.work[i] = samples[i]!
    this.filter.process(this.work, count)
    let kept = 0
    for (let i = this.skip; i < count; i += this.factor) this.work[kept++] = this.work[i]!
    this.skip = (this.skip + kept * this.factor - count) % this.factor
    return { samples: this.work, count: kept }
  }
}

/**
 * Power of the mains frequency and its harmonics up to 1 kHz (mean square), with the noise that stands beside each
 * line taken off. Where the lines are lost in the noise the value is what noise alone could hide there: two standard
 * deviations of the sum, so that a hum is never called absent on too short a stretch.
 */
export function humPower(samples: Float64Array, rateHz: number, mainsHz: 50 | 60): number {
  const spectrum = powerSpectrum(samples, rateHz, 'hann', HIGHEST_HZ * 1.05)
  const found = mainsFrequency(spectrum, mainsHz)
  let power = 0
  let variance = 0
  for (let n = 1; n * mainsHz <= HIGHEST_HZ; n++) {
    const line = lineAt(spectrum, n * found, mainsHz)
    power += line.power
    variance += line.variance
  }
  return Math.max(power, 2 * Math.sqrt(variance))
}

function mainsFrequency(spectrum: Spectrum, mainsHz: number): number {
  let best = { hz: mainsHz, power: 0 }
  const steps = 80
  for (let step = -steps; step <= steps; step++) {
    const hz = mainsHz + (step / steps) * MAINS_TOLERANCE_HZ
    let power = 0
    for (let n = 1; n * mainsHz <= HIGHEST_HZ; n++)
      power += spectrum.power[Math.round((n * hz) / spectrum.binHz)] ?? 0
    if (power > best.power || (power === best.power && Math.abs(hz - mainsHz) < Math.abs(best.hz - mainsHz)))
      best = { hz, power }
  }
  return best.hz
}

/** Power in the main lobe at a frequency less the mean noise of both sides, and the variance of that difference. */
function lineAt({ power, binHz, lobeHz }: Spectrum, hz: number, mainsHz: number) {
  const scale = noiseScale({ power, binHz, lobeHz }, 'hann')
  const reach = Math.min(8 * lobeHz, 0.4 * mainsHz)
  let sum = 0
  let width = 0
  const beside: number[] = []
  for (let k = Math.ceil((hz - reach) / binHz); k <= (hz + reach) / binHz; k++) {
    const here = power[k] ?? 0
    const distance = Math.abs(k * binHz - hz)
    if (distance <= lobeHz) {
      sum += here
      width++
    } else if (distance >= 2 * lobeHz) beside.push(here)
  }
  const noise = beside.reduce((total, value) => total + value, 0) / Math.max(1, beside.length)
  // noise in a bin is spread exponentially; the padded bins of a lobe hold about width x scale independent values
  const independent = Math.max(1, width * scale)
  return { power: (sum - noise * width) * scale, variance: (noise * width * scale) ** 2 / independent }
}

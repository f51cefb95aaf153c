import { describe, expect, it } from 'vitest'
import { HumDecimator, humPower } from '../../../simulator/signal/hum.ts'
import { sine, sumOf, whiteNoise } from '../../helpers/signals.ts'

/** Hum of a signal at 48 kHz through the decimator, dB re full scale. */
function humDb(signal: Float64Array, mainsHz: 50 | 60, rateHz = 48_000): number {
  const decimator = new HumDecimator(rateHz, 480)
  const slow: number[] = []
  for (let at = 0; at + 480 <= signal.length; at += 480) {
    const { samples, count } = decimator.take(signal.subarray(at, at + 480), 480)
    slow.push(...samples.subarray(0, count))
  }
  return 10 * Math.log10(humPower(Float64Array.from(slow), decimator.rateHz, mainsHz))
}

const SECONDS_5 = 5 * 48_000
const noise = whiteNoise(SECONDS_5, 1e-4, 3)

describe('humPower()', () => {
  it.each([50, 60] as const)(
    'adds the mains frequency of %i Hz and its harmonics, noise taken off',
    (mainsHz) => {
      const lines = [1, 2, 3, 5, 10].map((n) => sine(SECONDS_5, n * mainsHz, 48_000, 1e-3 / n))
      const expected = 10 * Math.log10([1, 2, 3, 5, 10].reduce((sum, n) => sum + (1e-3 / n) ** 2 / 2, 0))
      expect(humDb(sumOf(noise, ...lines), mainsHz)).toBeCloseTo(expected, 1)
    },
  )

  it('follows mains that wanders by 0.2 Hz', () => {
    const lines = [1, 2, 3, 7, 15].map((n) => sine(SECONDS_5, n * 49.8, 48_000, 1e-3))
    expect(humDb(sumOf(noise, ...lines), 50)).toBeCloseTo(10 * Math.log10((5 * 1e-6) / 2), 1)
  })

  it('reads a weak hum under the noise within 1 dB', () => {
    const line = sine(SECONDS_5, 100, 48_000, 2e-5)
    // -97 dB in noise of -80 dB
    expect(Math.abs(humDb(sumOf(noise, line), 50) - 10 * Math.log10(4e-10 / 2))).toBeLessThan(1)
  })

  it('leaves out what lies between the harmonics and above 1 kHz', () => {
    const others = [75, 125, 330, 1050, 4050].map((hz) => sine(SECONDS_5, hz, 48_000, 1e-3))
    expect(humDb(sumOf(noise, ...others), 50)).toBeLessThan(-100)
  })

  it('never calls hum absent in noise, only not more than noise can hide', () => {
    const hidden = humDb(noise, 50)
    expect(hidden).toBeGreaterThan(-125)
    expect(hidden).toBeLessThan(-105)
  })

  it('is 0 for digital silence', () => {
    expect(humPower(new Float64Array(8000), 4000, 50)).toBe(0)
  })
})

describe('HumDecimator', () => {
  it.each([44_100, 48_000, 96_000])('lets no tone above fold onto the harmonics at %i Hz', (rateHz) => {
    const slowRate = new HumDecimator(rateHz, 480).rateHz
    const folding = sine(rateHz * 5, slowRate - 100, rateHz, 0.1)
    expect(humDb(folding, 50, rateHz)).toBeLessThan(-23 - 60)
  })

  it('keeps every n-th sample without a gap between frames', () => {
    const decimator = new HumDecimator(44_100, 441)
    let kept = 0
    for (let frame = 0; frame < 1000; frame++) kept += decimator.take(new Float64Array(441), 441).count
    expect(kept).toBe(Math.ceil(441_000 / 11))
  })
})

import { describe, expect, it } from 'vitest'
import { noiseCorrectionDb } from '../../../src/shared/measure/noiseCorrectionDb.ts'

describe('noiseCorrectionDb()', () => {
  it('is the ISO 3744 formula: table values to their printed digit', () => {
    // K for d = 6, 7, 8, 9, 10 dB as the formula's usual table prints them, to 0.1 dB (from memory)
    expect([6, 7, 8, 9, 10].map((d) => Number(noiseCorrectionDb(d)!.toFixed(1)))).toEqual([
      1.3, 1, 0.7, 0.6, 0.5,
    ])
  })

  it.each([6, 9.5, 14.999, 15, 20, 40])(
    'gives back the signal of a sum that stands %d dB above its noise',
    (d) => {
      const noise = Math.pow(10, -80 / 10)
      const sum = noise * Math.pow(10, d / 10)
      const signalDb = 10 * Math.log10(sum - noise)
      expect(10 * Math.log10(sum) - noiseCorrectionDb(d)!).toBeCloseTo(signalDb, 9)
    },
  )

  it('does not step at 15 dB, the first stated departure', () => {
    expect(noiseCorrectionDb(15 - 1e-9)! - noiseCorrectionDb(15 + 1e-9)!).toBeLessThan(1e-9)
    expect(noiseCorrectionDb(16)).toBeGreaterThan(0.1)
  })

  it('has no value below 6 dB, the second', () => {
    expect(noiseCorrectionDb(6)).toBeCloseTo(1.2563, 4)
    expect(noiseCorrectionDb(5.999)).toBeNull()
    expect(noiseCorrectionDb(-Infinity)).toBeNull()
    expect(noiseCorrectionDb(NaN)).toBeNull()
  })

  it('is 0 when there is no noise at all', () => {
    expect(Object.is(noiseCorrectionDb(Infinity), 0)).toBe(true)
  })
})

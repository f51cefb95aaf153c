import { describe, expect, it } from 'vitest'
import { dbOfPower, meanPowerDb } from '../../../src/shared/measure/meanPowerDb.ts'

describe('meanPowerDb()', () => {
  it('of one sounding and one silent frame is half the power, 3.01 dB less', () => {
    // 10 lg 2, power addition of equal levels (closed form)
    expect(meanPowerDb([-20, -Infinity])).toBeCloseTo(-20 - 3.010299956639812, 12)
  })

  it('leaves equal levels as they are', () => {
    expect(meanPowerDb([-31.5, -31.5, -31.5])).toBeCloseTo(-31.5, 12)
  })

  it('is -Infinity for silence, null for nothing or for what is no level', () => {
    expect(meanPowerDb([-Infinity, -Infinity])).toBe(-Infinity)
    expect(meanPowerDb([])).toBeNull()
    expect(meanPowerDb([-20, NaN])).toBeNull()
    expect(meanPowerDb([-20, Infinity])).toBeNull()
    expect(dbOfPower(0)).toBe(-Infinity)
  })
})

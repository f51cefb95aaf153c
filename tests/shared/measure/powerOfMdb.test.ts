import { describe, expect, it } from 'vitest'
import { NOT_MEASURED_MDB, SILENCE_MDB } from '../../../src/shared/contract/quantities.ts'
import { powerOfMdb } from '../../../src/shared/measure/powerOfMdb.ts'

describe('powerOfMdb()', () => {
  it('is 10^(mdb/10000) to the last digits over the whole range', () => {
    for (let mdb = -300_000; mdb <= 100_000; mdb += 777) {
      const exact = Math.pow(10, mdb / 10_000)
      expect(Math.abs(powerOfMdb(mdb) / exact - 1)).toBeLessThan(2e-15 * (1 + Math.abs(mdb) / 10_000))
    }
    expect(powerOfMdb(-20_000)).toBeCloseTo(0.01, 15)
  })

  it('counts silence as power 0 and not measured as no value', () => {
    expect(powerOfMdb(SILENCE_MDB)).toBe(0)
    expect(powerOfMdb(NOT_MEASURED_MDB)).toBeNaN()
    expect(powerOfMdb(-300_001)).toBeNaN()
    expect(powerOfMdb(NaN)).toBeNaN()
  })
})

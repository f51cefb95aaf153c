import { describe, expect, it } from 'vitest'
import levels from '../../reference/levels.json' with { type: 'json' }
import {
  DBU_REFERENCE_V,
  dbuOfDbv,
  dbvOfDbu,
  dbvOfVolts,
  voltsOfDbv,
} from '../../../src/shared/measure/levelDb.ts'

const value = (id: string) => levels.values.find((entry) => entry.id === id)!.value

describe('levelDb', () => {
  it('takes 0 dBu as sqrt(0.6) V (IEC 60027-3 practice)', () => {
    expect(Math.abs(DBU_REFERENCE_V - value('dBu-reference'))).toBeLessThan(5e-5)
    expect(dbuOfDbv(0)).toBeCloseTo(value('dBu-minus-dBV'), 12)
  })

  it('gives the published volts and differences', () => {
    expect(voltsOfDbv(dbvOfDbu(4))).toBeCloseTo(value('plus4-dBu'), 12)
    expect(voltsOfDbv(-10)).toBeCloseTo(value('minus10-dBV'), 12)
    expect(dbvOfDbu(4) + 10).toBeCloseTo(value('plus4dBu-minus-minus10dBV'), 12)
    expect(dbvOfVolts(6)).toBeCloseTo(value('6V-in-dBV'), 12)
  })

  it('gives -Infinity for no voltage and NaN for none that can be', () => {
    expect(dbvOfVolts(0)).toBe(-Infinity)
    expect(dbvOfVolts(-1)).toBeNaN()
    expect(voltsOfDbv(-Infinity)).toBe(0)
    expect(voltsOfDbv(NaN)).toBeNaN()
  })
})

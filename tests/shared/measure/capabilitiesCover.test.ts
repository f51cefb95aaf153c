import { describe, expect, it } from 'vitest'
import { RULES, type RuleId } from '../../../src/shared/contract/rules.ts'
import { capabilitiesCover } from '../../../src/shared/measure/capabilitiesCover.ts'
import { isEnterableByHand } from '../../../src/shared/measure/isEnterableByHand.ts'
import { unitOf } from '../../../src/shared/measure/unitOf.ts'
import {
  criticalDifferenceDb,
  repeatabilityLimitDb,
} from '../../../src/shared/measure/criticalDifferenceDb.ts'

describe('capabilitiesCover()', () => {
  it('needs every one of `needs` and one of `needsAny`', () => {
    expect(capabilitiesCover('balance', ['jackLevel'])).toBe(true)
    expect(capabilitiesCover('balance', ['sixLevels'])).toBe(true)
    expect(capabilitiesCover('balance', ['noiseA', 'pitch'])).toBe(false)
    expect(capabilitiesCover('channelSeparation', ['jackLevel'])).toBe(false)
    expect(capabilitiesCover('snA', ['noiseA'])).toBe(true)
    expect(capabilitiesCover('contactTip', [])).toBe(false)
  })
})

describe('isEnterableByHand() and unitOf()', () => {
  it('name a meter for nothing that is read string by string', () => {
    for (const rule of Object.keys(RULES) as RuleId[]) {
      if (RULES[rule].per === 'element') expect(isEnterableByHand(rule)).toBe(false)
    }
    expect(isEnterableByHand('battery')).toBe(true)
    expect(isEnterableByHand('disturbanceLongest')).toBe(false)
    expect(unitOf('insulation')).toBe('Mohm')
  })
})

describe('criticalDifferenceDb()', () => {
  it('is 2.8 dB for 1 dB a reading, as the trade says, and 1.4 for 0.5', () => {
    expect(criticalDifferenceDb(1, 1, 0, 0)).toBeCloseTo(2.77, 2)
    expect(criticalDifferenceDb(0.5, 0.5, 0, 0)).toBeCloseTo(1.39, 2)
    expect(criticalDifferenceDb(1, 1, 0.5, 0.5)).toBeCloseTo(1.96 * Math.sqrt(2.5), 12)
    expect(criticalDifferenceDb(NaN, 1, 0, 0)).toBeNaN()
    expect(repeatabilityLimitDb(1)).toBe(2.8)
  })
})

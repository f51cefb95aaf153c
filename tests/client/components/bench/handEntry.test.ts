import { describe, expect, test } from 'vitest'
import {
  ENTRY_UNITS,
  enterableRules,
  firstUnitOf,
  standardUncertaintyOf,
} from '../../../../src/components/bench/handEntry.ts'
import { Unit } from '../../../../src/shared/contract/quantities.ts'
import { aSetup, aSheet } from '../../../fixtures/runParts.ts'
import { liveAt } from '../../../fixtures/runViews.ts'

describe('enterableRules()', () => {
  test('lists rules of the sheet that the bench lacks and a meter can read', () => {
    const rule = (name: 'contactTip' | 'channelSeparation') => ({
      rule: name,
      low: null,
      high: 1,
      onOutside: 'reject' as const,
      required: true,
    })
    const sheet = aSheet({ rules: [...aSheet().rules, rule('contactTip'), rule('channelSeparation')] })
    const capabilities = aSetup().capabilities.filter((one) => one !== 'sixLevels' && one !== 'battery')
    const view = { ...liveAt('entry'), setup: aSetup({ sheet, capabilities }) }
    expect(enterableRules(view)).toEqual(['battery', 'contactTip'])
    expect(enterableRules(liveAt('entry'))).toEqual([])
  })
})

describe('ENTRY_UNITS', () => {
  test('has for every unit of a rule one that is the unit itself', () => {
    for (const unit of Unit.options) expect(ENTRY_UNITS[unit].some((one) => one.factor === 1)).toBe(true)
  })

  test('offers milliohm first for a contact of 0.1 ohm, and volts for a battery', () => {
    expect(firstUnitOf('contactTip')).toBe('m\u03a9')
    expect(firstUnitOf('battery')).toBe('V')
    expect(firstUnitOf('insulation')).toBe('M\u03a9')
    expect(firstUnitOf('currentUnplugged')).toBe('\u00b5A')
  })
})

describe('standardUncertaintyOf()', () => {
  test('divides a half-width by the root of three (JCGM 100:2008, 4.3.7)', () => {
    expect(standardUncertaintyOf(1)).toBeCloseTo(0.57735, 5)
    expect(standardUncertaintyOf(0)).toBe(0)
  })
})

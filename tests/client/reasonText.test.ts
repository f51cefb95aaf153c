import { describe, expect, test } from 'vitest'
import { CAUSES, causeText } from '../../src/causeTexts.ts'
import { advice, reasonOf, verdictReasons } from '../../src/reasonText.ts'
import type { RunView } from '../../src/shared/contract/runs.ts'
import { aResult, aSheet } from '../fixtures/runParts.ts'
import { sealedDeadString, sealedFail, sealedNone, sealedPass } from '../fixtures/runViews.ts'

const texts = (view: RunView) => verdictReasons(view, 'dBV').map((reason) => reason.text)
const sheet = aSheet()
const one = (...args: Parameters<typeof aResult>) => reasonOf(aResult(...args), sealedFail(), 'dBV')

describe('verdictReasons()', () => {
  test('says in plain words what rejects, with value and limit', () => {
    expect(texts(sealedFail())).toEqual([
      'String 4, D is 3.3 dB low, limit 2.5 dB',
      'Range of balance is 4.3 dB, limit 4.0 dB',
      'Mains hum is \u221268.3 dBV, limit \u221275.0 dBV',
      'The contact broke 4 times in the wiggle, limit 0',
      'Longest contact disturbance is 12.6 ms, limit 1.0 ms',
    ])
  })

  test('adds margin, uncertainty and count', () => {
    expect(verdictReasons(sealedFail(), 'dBV')[0]!.detail).toBe(
      'margin \u22120.8 dB \u00b7 U \u00b10.7 \u00b7 n 3',
    )
  })

  test('tells a silent string once', () => {
    expect(texts(sealedDeadString()).filter((text) => text.startsWith('String 4'))).toEqual([
      'String 4, D gives no signal',
    ])
  })

  test('has nothing to say of a pass, nor of a bench that was not verified', () => {
    expect(texts(sealedPass())).toEqual([])
    expect(texts(sealedNone())).toEqual([])
  })

  test('names what was required and has no result when there is no verdict', () => {
    const view = sealedNone()
    const results = [
      aResult('balance', 0.2, { sheet, stringNo: 3, result: 'invalid', why: 'scatterTooLarge' }),
      aResult('hum', null, { sheet, why: 'notMeasurable' }),
      aResult('step', null, { sheet, why: 'notReached' }),
    ]
    expect(texts({ ...view, measured: { ...view.measured, results } })).toEqual([
      'String 3, G, balance: the plucks lie too far apart',
      'Mains hum: this bench cannot measure it',
    ])
  })
})

describe('reasonOf()', () => {
  test('words states, both limits, bounds and the guard band', () => {
    expect(one('switchOpen', 0, { sheet }).text).toBe(
      'Ring and sleeve are joined with the plug out: the preamp never switches off',
    )
    expect(one('meanLevel', -6.2, { sheet }).text).toBe(
      'Mean level against the model is \u22126.2 dB, limits \u22124.0 to +4.0 dB',
    )
    expect(one('balance', -30, { sheet, stringNo: 2, atMost: true }).text).toBe(
      'String 2, B is at least 30.0 dB low, limit 2.5 dB',
    )
    expect(one('balance', 2.4, { sheet, stringNo: 2, result: 'outside', why: 'inGuardBand' }).text).toBe(
      'String 2, B is 2.4 dB high, limit 2.5 dB, not shown to conform',
    )
    expect(one('disturbanceCount', 1, { sheet }).text).toBe('The contact broke 1 time in the wiggle, limit 0')
  })

  test('shows levels in the chosen unit', () => {
    expect(reasonOf(aResult('hum', -68.3, { sheet }), sealedFail(), 'dBu').text).toBe(
      'Mains hum is \u221266.1 dBu, limit \u221272.8 dBu',
    )
  })
})

describe('advice()', () => {
  test('lists only what advises', () => {
    expect(advice(sealedFail(), 'dBV').map((reason) => reason.text)).toEqual([
      'Largest step between neighbours is 4.3 dB, limit 3.5 dB',
    ])
  })
})

describe('causeText()', () => {
  test('puts the strings in, and leaves no place open', () => {
    for (const key of Object.keys(CAUSES) as (keyof typeof CAUSES)[]) {
      const { cause, checkFirst } = causeText(key, 'string 4, D')
      expect(`${cause} ${checkFirst}`).not.toContain('{')
      expect(checkFirst).toMatch(/[.?]$/)
    }
    expect(causeText('poorSeating', 'string 4, D').cause).toContain('string 4, D is badly seated')
  })
})

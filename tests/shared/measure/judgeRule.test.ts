import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { isInside, judgeRule, NO_FACT, type RuleFact } from '../../../src/shared/measure/judgeRule.ts'
import { sheetRule } from '../../helpers/runSetup.ts'

const simple = { stringNo: null, guard: 0, patternMissing: false }
const fact = (change: Partial<RuleFact>): RuleFact => ({ ...NO_FACT, n: 3, ...change })
const balance = sheetRule('balance', { low: -2.5, high: 2.5 })
const range = sheetRule('range', { high: 4 })
const level = sheetRule('level', { low: -40, high: -5 })

describe('judgeRule()', () => {
  it('is within at the limits themselves and outside beyond, with the margin', () => {
    expect(judgeRule(balance, fact({ value: 2.5 }), simple)).toMatchObject({
      result: 'within',
      margin: 0,
      why: null,
    })
    expect(judgeRule(balance, fact({ value: -2 }), simple)).toMatchObject({ result: 'within', margin: 0.5 })
    expect(judgeRule(balance, fact({ value: -3 }), simple)).toMatchObject({
      result: 'outside',
      margin: -0.5,
      why: 'beyondLimit',
    })
  })

  it.each([NaN, Infinity, -Infinity, null])('never passes a value of %s', (value) => {
    for (const rule of [balance, range, level]) {
      const result = judgeRule(rule, fact({ value }), simple)
      expect(result).toMatchObject({ result: 'invalid', why: 'notFinite', value: null, margin: null })
      expect(judgeRule(rule, fact({ value, atMost: true }), simple).result).not.toBe('within')
    }
  })

  it('never passes against a limit that is no number, or without any', () => {
    expect(judgeRule({ ...range, high: NaN }, fact({ value: 1 }), simple).result).toBe('invalid')
    expect(judgeRule({ ...range, high: Infinity }, fact({ value: 1 }), simple).result).toBe('invalid')
    expect(judgeRule({ ...range, high: null }, fact({ value: 1 }), simple).result).toBe('invalid')
  })

  it('calls a value between guarded and specified limit outside, in the guard band', () => {
    const guarded = { ...simple, guard: 0.8 }
    expect(judgeRule(balance, fact({ value: 1.7 }), guarded).result).toBe('within')
    expect(judgeRule(balance, fact({ value: 1.71 }), guarded)).toMatchObject({
      result: 'outside',
      why: 'inGuardBand',
    })
    expect(judgeRule(balance, fact({ value: -2.5 }), guarded)).toMatchObject({
      result: 'outside',
      why: 'inGuardBand',
    })
    expect(judgeRule(balance, fact({ value: 2.6 }), guarded)).toMatchObject({
      result: 'outside',
      why: 'beyondLimit',
    })
  })

  it('takes a bound only when it lies wholly inside', () => {
    expect(judgeRule(range, fact({ value: 3, atMost: true }), simple)).toMatchObject({
      result: 'within',
      margin: 1,
    })
    expect(judgeRule(range, fact({ value: 5, atMost: true }), simple)).toMatchObject({
      result: 'invalid',
      why: 'censoredAcrossLimit',
    })
    expect(judgeRule(balance, fact({ value: 0, atMost: true }), simple)).toMatchObject({
      result: 'invalid',
      why: 'censoredAcrossLimit',
      margin: null,
    })
    expect(judgeRule(balance, fact({ value: -60, atMost: true }), simple)).toMatchObject({
      result: 'outside',
      why: 'beyondLimit',
      margin: -57.5,
    })
  })

  it('takes a value that is at least so much as outside when that is beyond the limit, else as unknown', () => {
    expect(judgeRule(range, fact({ atLeast: 30 }), simple)).toMatchObject({
      result: 'outside',
      why: 'noSignal',
    })
    expect(judgeRule(range, fact({ atLeast: 3 }), simple)).toMatchObject({
      result: 'invalid',
      why: 'censoredAcrossLimit',
    })
  })

  it.each([
    ['notTested', { notTested: 'notMeasurable' }],
    ['notTested', { notTested: 'notReached' }],
    ['invalid', { invalid: 'scatterTooLarge' }],
    ['invalid', { invalid: 'tooFewPlucks' }],
    ['invalid', { invalid: 'noReference' }],
    ['invalid', { invalid: 'disagreesWithState' }],
    ['outside', { outside: 'noSignal' }],
  ] as const)('is %s for %o whatever the value', (result, change) => {
    const judged = judgeRule(balance, fact({ value: 0, ...change }), simple)
    expect(judged.result).toBe(result)
    expect(judged.why).toBe(Object.values(change)[0])
  })

  it('takes yes/no rules as 1 and 0 and nothing between', () => {
    const open = sheetRule('switchOpen')
    expect(judgeRule(open, fact({ value: 1 }), simple).result).toBe('within')
    expect(judgeRule(open, fact({ value: 0 }), simple).result).toBe('outside')
    expect(judgeRule(open, fact({ value: 0.5 }), simple).result).toBe('invalid')
  })

  it('only advises without a pattern in force, and says so', () => {
    const judged = judgeRule(balance, fact({ value: 9 }), { ...simple, patternMissing: true })
    expect(judged).toMatchObject({
      result: 'outside',
      onOutside: 'advise',
      required: false,
      why: 'patternNotSet',
    })
  })

  it('shows U for the sides that the rule has, and the probability of conformity', () => {
    const parts = [{ u: 0.5, dof: 12 }]
    const two = judgeRule(balance, fact({ value: 2, parts }), simple)
    expect(two.expandedU).toBeCloseTo(0.5 * 2.1788128296672284, 9)
    // scipy 1.17.1: t.cdf(1, 12) - t.cdf(-9, 12)
    expect(two.pConform).toBeCloseTo(0.8314749189781374, 10)
    const one = judgeRule(sheetRule('snA', { low: 55 }), fact({ value: 60, parts }), simple)
    expect(one.expandedU).toBeCloseTo(0.5 * 1.782287555649319, 9)
    const none = judgeRule(balance, fact({ value: 2 }), simple)
    expect(none).toMatchObject({ expandedU: null, pConform: null })
  })

  it('takes U and probability of a range from its simulation', () => {
    const simulated = () => ({ expandedOneSided: 0.7, shareUpTo: (limit: number) => (limit === 4 ? 0.9 : 0) })
    expect(judgeRule(range, fact({ value: 3, simulated }), simple)).toMatchObject({
      expandedU: 0.7,
      pConform: 0.9,
    })
  })
})

describe('isInside()', () => {
  it('is true only for finite values between the limits', () => {
    fc.assert(
      fc.property(fc.double(), fc.double({ min: -5, max: 5, noNaN: true }), (value, low) => {
        expect(isInside(value, low, low + 1, 0)).toBe(
          Number.isFinite(value) && value >= low && value <= low + 1,
        )
      }),
    )
    expect(isInside(1, null, null, 0)).toBe(false)
    expect(isInside(-Infinity, null, 3, 0)).toBe(false)
  })
})

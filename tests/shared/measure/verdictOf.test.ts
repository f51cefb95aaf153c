import { describe, expect, it } from 'vitest'
import { verdictOf } from '../../../src/shared/measure/verdictOf.ts'

const rule = (
  result: 'within' | 'outside' | 'invalid' | 'notTested',
  onOutside: 'reject' | 'advise' = 'reject',
  required = true,
) => ({ result, onOutside, required })
const sound = { verified: true, stopped: false }

describe('verdictOf()', () => {
  it('passes when every rule is within', () => {
    expect(verdictOf([rule('within'), rule('within', 'advise', false)], sound)).toBe('pass')
  })

  it('gives none before all else when the bench is not verified or the run was stopped', () => {
    expect(verdictOf([rule('within')], { verified: false, stopped: false })).toBe('none')
    expect(verdictOf([rule('outside')], { verified: false, stopped: false })).toBe('none')
    expect(verdictOf([rule('outside')], { verified: true, stopped: true })).toBe('none')
  })

  it('fails for a reject rule outside, even beside required rules that are invalid or not tested', () => {
    expect(verdictOf([rule('invalid'), rule('notTested'), rule('outside')], sound)).toBe('fail')
    expect(verdictOf([rule('outside', 'reject', false), rule('within')], sound)).toBe('fail')
  })

  it.each(['invalid', 'notTested'] as const)('gives none for a required rule %s', (result) => {
    expect(verdictOf([rule('within'), rule(result)], sound)).toBe('none')
    expect(verdictOf([rule('within'), rule(result, 'advise', true)], sound)).toBe('none')
  })

  it('passes over advice that is outside and over what is not required', () => {
    expect(verdictOf([rule('outside', 'advise', true), rule('within')], sound)).toBe('pass')
    expect(
      verdictOf(
        [rule('invalid', 'advise', false), rule('notTested', 'reject', false), rule('within')],
        sound,
      ),
    ).toBe('pass')
  })

  it('gives none when no required reject rule is within: nothing was shown', () => {
    expect(verdictOf([rule('within', 'reject', false), rule('within', 'advise', false)], sound)).toBe('none')
    expect(verdictOf([rule('within', 'advise', true)], sound)).toBe('none')
    expect(verdictOf([rule('outside', 'advise', true)], sound)).toBe('none')
    expect(verdictOf([rule('invalid', 'reject', false)], sound)).toBe('none')
    expect(verdictOf([rule('within', 'advise', true), rule('within')], sound)).toBe('pass')
  })

  it('gives none when nothing was judged', () => {
    expect(verdictOf([], sound)).toBe('none')
  })
})

import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { balanceDb, referenceOf } from '../../../src/shared/measure/balanceDb.ts'
import { rangeDb } from '../../../src/shared/measure/rangeDb.ts'
import { stepDb } from '../../../src/shared/measure/stepDb.ts'

const elements = (...levels: (number | null)[]) => levels.map((levelDb) => ({ levelDb, atMost: false }))

describe('referenceOf()', () => {
  it('is the mean of all six when they lie close', () => {
    const { referenceDb, members } = referenceOf(elements(-20, -21, -19, -20, -22, -18))
    expect(referenceDb).toBeCloseTo(-20, 12)
    expect(members).toEqual([true, true, true, true, true, true])
  })

  it('leaves a dead string out, so that the five good ones do not look loud', () => {
    const dead = [...elements(-20, -20, -20, -20, -20), { levelDb: -76, atMost: true }]
    const { referenceDb, members } = referenceOf(dead)
    expect(referenceDb).toBe(-20)
    expect(members).toEqual([true, true, true, true, true, false])
  })

  it('takes a string exactly 6 dB from the median and not one further off', () => {
    const { members } = referenceOf(elements(-20, -20, -20, -20, -26, -26.001))
    expect(members).toEqual([true, true, true, true, true, false])
  })

  it('never takes a censored string, even one whose bound lies close', () => {
    const { members } = referenceOf([...elements(-20, -20, -20, -20, -20), { levelDb: -20, atMost: true }])
    expect(members[5]).toBe(false)
  })

  it('is nothing without levels, or when none lies near the median', () => {
    expect(referenceOf(elements(null, null)).referenceDb).toBeNull()
    expect(referenceOf(elements(NaN, -Infinity)).referenceDb).toBeNull()
    expect(referenceOf(elements(0, 0, 0, -40, -40, -40)).referenceDb).toBeNull()
  })
})

describe('balanceDb()', () => {
  it('is level minus reference minus pattern', () => {
    expect(balanceDb(-21, -20, 0.5)).toBe(-1.5)
  })

  it('is null when a part is missing or not finite', () => {
    expect(balanceDb(null, -20, 0)).toBeNull()
    expect(balanceDb(-20, null, 0)).toBeNull()
    expect(balanceDb(-Infinity, -20, 0)).toBeNull()
    expect(balanceDb(-20, -20, NaN)).toBeNull()
  })

  it('ignores a common offset', () => {
    const level = fc.double({ min: -30, max: -10, noNaN: true })
    fc.assert(
      fc.property(
        fc.array(level, { minLength: 6, maxLength: 6 }),
        fc.double({ min: -20, max: 20, noNaN: true }),
        (levels, offset) => {
          const balances = (shift: number) => {
            const shifted = levels.map((value) => value + shift)
            const { referenceDb } = referenceOf(elements(...shifted))
            return shifted.map((value) => balanceDb(value, referenceDb, 0))
          }
          const [before, after] = [balances(0), balances(offset)]
          // a string within rounding of the 6 dB edge may change sides
          fc.pre(before.every((value) => value !== null) && after.every((value) => value !== null))
          const membersOf = (shift: number) =>
            referenceOf(elements(...levels.map((value) => value + shift))).members
          fc.pre(JSON.stringify(membersOf(0)) === JSON.stringify(membersOf(offset)))
          before.forEach((value, i) => expect(after[i]).toBeCloseTo(value, 9))
        },
      ),
    )
  })
})

describe('rangeDb() and stepDb()', () => {
  it('are the whole spread and the largest difference between neighbours', () => {
    expect(rangeDb([0, 1, -1, 0, 0, 2])).toBe(3)
    expect(stepDb([0, 1, -1, 0, 0, 2])).toBe(2)
    expect(stepDb([0, 1, 2, 3])).toBe(1)
  })

  it('are null when a string is missing or not finite', () => {
    for (const missing of [null, NaN, -Infinity]) {
      expect(rangeDb([0, missing, 1])).toBeNull()
      expect(stepDb([0, missing, 1])).toBeNull()
    }
    expect(rangeDb([])).toBeNull()
    expect(stepDb([1])).toBeNull()
  })
})

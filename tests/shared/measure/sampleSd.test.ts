import { describe, expect, it } from 'vitest'
import strd from '../../reference/nist-strd.json' with { type: 'json' }
import { meanOf } from '../../../src/shared/measure/meanOf.ts'
import { medianOf } from '../../../src/shared/measure/medianOf.ts'
import { pooledSd } from '../../../src/shared/measure/pooledSd.ts'
import { sampleSd } from '../../../src/shared/measure/sampleSd.ts'

/** The sets of 1001 values are told by their rule: a first value, then 500 pairs. */
const PAIRS: Record<string, [number, number, number]> = {
  NumAcc2: [1.2, 1.1, 1.3],
  NumAcc4: [10_000_000.2, 10_000_000.1, 10_000_000.3],
}

function dataOf(entry: (typeof strd.values)[number]): number[] {
  if (entry.data) return entry.data
  const [first, low, high] = PAIRS[entry.id]!
  return [first, ...Array.from({ length: 1000 }, (_, i) => (i % 2 === 0 ? low : high))]
}

describe('meanOf() and sampleSd()', () => {
  it.each(strd.values.map((entry) => [entry.id, entry] as const))(
    'reach the certified values of the NIST set %s',
    (_, entry) => {
      const data = dataOf(entry)
      const { mean, sd } = entry.certified
      expect(Math.abs(meanOf(data)! / mean - 1)).toBeLessThanOrEqual(entry.tolerance.rel_mean)
      expect(Math.abs(sampleSd(data)! / sd - 1)).toBeLessThanOrEqual(entry.tolerance.rel_sd)
    },
  )

  it('give null when there is too little', () => {
    expect(meanOf([])).toBeNull()
    expect(sampleSd([])).toBeNull()
    expect(sampleSd([1])).toBeNull()
  })

  it('show a value that is not finite', () => {
    expect(meanOf([1, NaN])).toBeNaN()
    expect(meanOf([1, -Infinity])).toBe(-Infinity)
    expect(sampleSd([1, NaN])).toBeNaN()
    expect(sampleSd([1, -Infinity])).toBeNaN()
  })
})

describe('pooledSd()', () => {
  it('weighs each variance by its degrees of freedom', () => {
    // variances 1 (dof 2) and 4.5 (dof 1): (2 * 1 + 4.5) / 3
    expect(pooledSd([[-1, 0, 1], [0, 3], [7]])).toEqual({ sd: Math.sqrt(6.5 / 3), dof: 3 })
  })

  it('is null without two values in any group, or with one that is not finite', () => {
    expect(pooledSd([[1], [2], []])).toBeNull()
    expect(pooledSd([[1, NaN]])).toBeNull()
  })
})

describe('medianOf()', () => {
  it('is the middle value, or the mean of the two middle ones', () => {
    expect(medianOf([5, 1, 3])).toBe(3)
    expect(medianOf([3, 1, 2, 10])).toBe(2.5)
  })

  it('sorts silence lowest, leaves NaN out, and is null for nothing', () => {
    expect(medianOf([-Infinity, -Infinity, 4])).toBe(-Infinity)
    expect(medianOf([NaN, 4])).toBe(4)
    expect(medianOf([NaN])).toBeNull()
    expect(medianOf([])).toBeNull()
  })
})

import { describe, expect, it } from 'vitest'
import { makeRandom } from '../../../simulator/model/random.ts'

const COUNT = 20_000

describe('makeRandom()', () => {
  it('gives the same numbers for the same seed and stream', () => {
    const one = makeRandom(7, 'noise')
    const other = makeRandom(7, 'noise')
    const numbers = Array.from({ length: 50 }, () => one.normal())
    expect(Array.from({ length: 50 }, () => other.normal())).toEqual(numbers)
  })

  it('gives other numbers for another seed or another stream', () => {
    const first = makeRandom(7, 'noise').uniform()
    expect(makeRandom(8, 'noise').uniform()).not.toBe(first)
    expect(makeRandom(7, 'pluck').uniform()).not.toBe(first)
  })

  it('normal() has mean 0 and standard deviation 1 within four standard errors', () => {
    const random = makeRandom(1, 'test')
    const numbers = Array.from({ length: COUNT }, () => random.normal())
    const mean = numbers.reduce((sum, x) => sum + x, 0) / COUNT
    const variance = numbers.reduce((sum, x) => sum + (x - mean) ** 2, 0) / (COUNT - 1)
    expect(Math.abs(mean)).toBeLessThan(4 / Math.sqrt(COUNT))
    expect(Math.abs(variance - 1)).toBeLessThan(4 * Math.sqrt(2 / COUNT))
  })

  it('exponential() has the mean that is asked for, normalWithin() stays inside', () => {
    const random = makeRandom(2, 'test')
    const waits = Array.from({ length: COUNT }, () => random.exponential(3))
    expect(waits.reduce((sum, x) => sum + x, 0) / COUNT).toBeCloseTo(3, 0)
    for (let i = 0; i < 2000; i++) expect(Math.abs(random.normalWithin(1.5))).toBeLessThanOrEqual(1.5)
  })
})

import { describe, expect, it } from 'vitest'
import guardBand from '../../reference/guard-band.json' with { type: 'json' }
import { balanceUncertainty } from '../../../src/shared/measure/balanceUncertainty.ts'
import { levelUncertainty } from '../../../src/shared/measure/levelUncertainty.ts'
import { rangeStepUncertainty } from '../../../src/shared/measure/rangeStepUncertainty.ts'
import { chiSquareFrom, normalFrom, seededRandom } from '../../../src/shared/measure/seededRandom.ts'
import { combinedU } from '../../../src/shared/measure/welchSatterthwaite.ts'
import { sampleSd } from '../../../src/shared/measure/sampleSd.ts'

const part = (scatter: number, own = 0) => ({ scatter: { u: scatter, dof: 12 }, own: { u: own, dof: null } })
const ALL = [true, true, true, true, true, true]

describe('levelUncertainty()', () => {
  it('holds s_p^2/n, calibration, resolution and start', () => {
    const parts = levelUncertainty({
      scatter: { sd: 0.9, dof: 12 },
      n: 3,
      uCalOwnDb: 0.05,
      uCalSharedDb: 0.1,
      frameMs: 10,
      decayDbPerS: 8,
    })
    const rectangular = guardBand.values.find((entry) => entry.id === 'type-b-divisors')!.value as {
      rectangular: number
    }
    // a frame is the full width, twice the half width that the divisor is for
    const uStart = rectangular.rectangular * 0.005 * 8
    const uRes = rectangular.rectangular * 0.0005
    expect(parts.scatter).toEqual({ u: 0.9 / Math.sqrt(3), dof: 12 })
    expect(parts.shared.u).toBe(0.1)
    expect(parts.own.u).toBeCloseTo(Math.hypot(0.05, uStart, uRes), 12)
    expect(parts.start.u).toBeCloseTo(Math.hypot(uStart, uRes), 12)
  })
})

describe('balanceUncertainty()', () => {
  it('is (5/6)^2 u_e^2 + (1/36) sum of the others + u_pattern^2 with all six in the reference', () => {
    const us = [0.2, 0.3, 0.4, 0.5, 0.6, 0.7]
    const elements = us.map((u) => part(u))
    const others = us.slice(1).reduce((sum, u) => sum + u * u, 0)
    const expected = Math.sqrt((25 / 36) * us[0]! ** 2 + others / 36 + 0.2 ** 2)
    expect(combinedU(balanceUncertainty(0, elements, ALL, 0.2))).toBeCloseTo(expected, 12)
  })

  it.each([
    ['all six in the reference', ALL, 2],
    ['the element outside the reference', [true, true, false, true, true, true], 2],
    ['two elements outside it', [true, false, true, true, true, false], 2],
  ])('agrees with a Monte Carlo with %s', (_, members, element) => {
    const us = [0.3, 0.5, 0.4, 0.6, 0.2, 0.35]
    const normal = normalFrom(seededRandom(11))
    const m = members.filter(Boolean).length
    const balances = Array.from({ length: 40_000 }, () => {
      const levels = us.map((u) => u * normal())
      const reference = levels.reduce((sum, level, i) => (members[i] ? sum + level : sum), 0) / m
      return levels[element]! - reference
    })
    const simulated = sampleSd(balances)!
    const formula = combinedU(
      balanceUncertainty(
        element,
        us.map((u) => part(u)),
        members,
        0,
      ),
    )
    // sd of a simulated sd: 1 / sqrt(2 N) = 0.35 %
    expect(Math.abs(formula / simulated - 1)).toBeLessThan(0.015)
  })

  it('keeps one pooled scatter as one part with its degrees of freedom', () => {
    const [scatter, rest] = balanceUncertainty(
      0,
      [1, 1, 1, 1, 1, 1].map(() => part(0.3, 0.1)),
      ALL,
      0,
    )
    expect(scatter!.dof).toBe(12)
    expect(rest!.dof).toBeNull()
    expect(scatter!.u).toBeCloseTo(0.3 * Math.sqrt(30 / 36), 12)
  })

  it('is empty without a level or a reference', () => {
    expect(balanceUncertainty(0, [null, part(1)], [false, true], 0)).toEqual([])
    expect(balanceUncertainty(0, [part(1)], [false], 0)).toEqual([])
  })
})

describe('rangeStepUncertainty()', () => {
  const sure = [0, 0, 0, 0, 0, 0].map(() => ({ scatter: { u: 0.3, dof: null }, own: { u: 0, dof: null } }))

  it('gives the same numbers every time', () => {
    const run = () => rangeStepUncertainty([0, 1, 0, -1, 0, 0.5], sure, 0.1)!
    expect(run().range.u).toBe(run().range.u)
    expect(run().step.expandedOneSided).toBe(run().step.expandedOneSided)
  })

  it('of two far strings is the uncertainty of their difference', () => {
    const { range } = rangeStepUncertainty([10, 0, 0, 0, 0, -10], sure, 0)!
    expect(range.u).toBeCloseTo(0.3 * Math.SQRT2, 1)
    expect(Math.abs(range.u / (0.3 * Math.SQRT2) - 1)).toBeLessThan(0.03)
    expect(Math.abs(range.expandedTwoSided / (1.96 * 0.3 * Math.SQRT2) - 1)).toBeLessThan(0.05)
    expect(range.shareUpTo(20)).toBeCloseTo(0.5, 1)
    expect(range.shareUpTo(0)).toBe(0)
    expect(range.shareUpTo(100)).toBe(1)
  })

  it('of six equal strings stands as the trade says: 2.53 sigma between highest and lowest', () => {
    // expected range of six normal values, d2(6) = 2.534 (control-chart constant)
    const unit = sure.map(() => ({ scatter: { u: 1, dof: null }, own: { u: 0, dof: null } }))
    const { range } = rangeStepUncertainty([0, 0, 0, 0, 0, 0], unit, 0)!
    let median = 0
    while (range.shareUpTo(median) < 0.5) median += 0.01
    expect(Math.abs(median - 2.47)).toBeLessThan(0.05)
    expect(Math.abs(range.u - 0.848)).toBeLessThan(0.02)
  })

  it('widens with few degrees of freedom behind the scatter', () => {
    const few = sure.map((one) => ({ ...one, scatter: { u: 0.3, dof: 3 } }))
    const of = (parts: typeof few | typeof sure) =>
      rangeStepUncertainty([10, 0, 0, 0, 0, -10], parts, 0)!.range
    expect(of(few).u).toBeGreaterThan(1.3 * of(sure).u)
  })

  it('has no value when a string has none', () => {
    expect(rangeStepUncertainty([0, null, 0, 0, 0, 0], sure, 0)).toBeNull()
    expect(rangeStepUncertainty([0, 0], [sure[0]!, null], 0)).toBeNull()
  })
})

describe('seededRandom()', () => {
  it('repeats by seed and differs between seeds', () => {
    const draw = (seed: number) => Array.from({ length: 5 }, seededRandom(seed))
    expect(draw(7)).toEqual(draw(7))
    expect(draw(7)).not.toEqual(draw(8))
  })

  it('fills 0..1 evenly, and normalFrom() and chiSquareFrom() have their mean and variance', () => {
    const random = seededRandom(3)
    const normal = normalFrom(random)
    const moments = (draw: () => number) => {
      const values = Array.from({ length: 40_000 }, draw)
      const mean = values.reduce((sum, value) => sum + value, 0) / values.length
      return { mean, variance: sampleSd(values)! ** 2 }
    }
    const flat = moments(random)
    expect(Math.abs(flat.mean - 0.5)).toBeLessThan(0.01)
    expect(Math.abs(flat.variance - 1 / 12)).toBeLessThan(0.002)
    const bell = moments(normal)
    expect(Math.abs(bell.mean)).toBeLessThan(0.02)
    expect(Math.abs(bell.variance - 1)).toBeLessThan(0.03)
    for (const dof of [1, 5, 12]) {
      const chi = moments(() => chiSquareFrom(normal, random, dof))
      expect(Math.abs(chi.mean / dof - 1)).toBeLessThan(0.04)
      expect(Math.abs(chi.variance / (2 * dof) - 1)).toBeLessThan(0.1)
    }
  })
})

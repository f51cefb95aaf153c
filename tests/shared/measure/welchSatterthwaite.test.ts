import { describe, expect, it } from 'vitest'
import guardBand from '../../reference/guard-band.json' with { type: 'json' }
import { expandedUncertainty } from '../../../src/shared/measure/expandedUncertainty.ts'
import { tQuantile } from '../../../src/shared/measure/tQuantile.ts'
import { combinedU, welchSatterthwaite } from '../../../src/shared/measure/welchSatterthwaite.ts'

const budget = guardBand.values.find((entry) => entry.id === 'gum-h1-budget')!
const contributions = budget.inputs!.contributions_nm!
const parts = contributions.map((u, i) => ({ u, dof: (budget.inputs!.dof as number[])[i]! }))

describe('the end-gauge example of JCGM 100, H.1', () => {
  it('combinedU() gives its combined uncertainty, 32 nm', () => {
    expect(Math.abs(combinedU(parts) - 32)).toBeLessThan(0.5)
  })

  it('welchSatterthwaite() gives its effective degrees of freedom, 16.7', () => {
    expect(Math.abs(welchSatterthwaite(parts)! - 16.7)).toBeLessThan(0.1)
    const unrounded = parts.map((part, i) => (i === 5 ? { ...part, u: 16.675 } : part))
    expect(welchSatterthwaite(unrounded)).toBeCloseTo(16.644901029692765, 9)
  })

  it('expandedUncertainty() cuts them to 16 and gives k = 2.12', () => {
    expect(expandedUncertainty(1, welchSatterthwaite(parts), 2)).toBeCloseTo(2.1199052992212546, 10)
    expect(expandedUncertainty(32, 16, 2)! / 32).toBeCloseTo(2.12, 2)
  })
})

describe('welchSatterthwaite()', () => {
  it('is infinite (null) without a part of finite degrees of freedom', () => {
    expect(welchSatterthwaite([{ u: 1, dof: null }])).toBeNull()
    expect(welchSatterthwaite([])).toBeNull()
    expect(welchSatterthwaite([{ u: 0, dof: 3 }])).toBeNull()
  })

  it('of equal parts adds their degrees of freedom', () => {
    expect(welchSatterthwaite([1, 2, 3].map(() => ({ u: 0.3, dof: 5 })))).toBeCloseTo(15, 10)
  })
})

describe('tQuantile()', () => {
  // scipy 1.17.1, stats.t.ppf
  it.each([
    [0.975, 1, 12.706204736174694],
    [0.975, 2, 4.302652729749462],
    [0.975, 5, 2.5705818356363146],
    [0.975, 12, 2.1788128296672284],
    [0.975, 16, 2.1199052992212546],
    [0.95, 12, 1.782287555649319],
    [0.95, 4.5, 2.065575888878524],
    [0.9, 30, 1.3104150253913955],
    [0.975, 1000, 1.9623390808264083],
  ])('of %d with %d degrees of freedom agrees with scipy', (probability, dof, expected) => {
    expect(Math.abs(tQuantile(probability, dof) / expected - 1)).toBeLessThan(1e-10)
    expect(tQuantile(1 - probability, dof)).toBeCloseTo(-expected, 9)
  })

  it('of infinite degrees of freedom is the normal quantile', () => {
    expect(tQuantile(0.975, null)).toBeCloseTo(1.959963984540054, 12)
  })

  it('is NaN where there is none', () => {
    for (const [probability, dof] of [
      [0, 3],
      [1, 3],
      [0.5, 0],
      [NaN, 3],
      [0.9, NaN],
    ] as const) {
      expect(tQuantile(probability, dof)).toBeNaN()
    }
  })
})

describe('expandedUncertainty()', () => {
  it('is smaller for a single limit than for two', () => {
    expect(expandedUncertainty(1, 12, 1)).toBeCloseTo(1.782287555649319, 9)
    expect(expandedUncertainty(1, null, 1)).toBeCloseTo(1.6448536269514722, 9)
  })

  it('takes less than one degree of freedom as one', () => {
    expect(expandedUncertainty(1, 0.4, 2)).toBeCloseTo(12.706204736174694, 7)
  })

  it('is null without an uncertainty', () => {
    expect(expandedUncertainty(null, 3, 2)).toBeNull()
    expect(expandedUncertainty(NaN, 3, 2)).toBeNull()
    expect(expandedUncertainty(Infinity, 3, 2)).toBeNull()
  })
})

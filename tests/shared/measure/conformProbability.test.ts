import { describe, expect, it } from 'vitest'
import guardBand from '../../reference/guard-band.json' with { type: 'json' }
import { conformProbability } from '../../../src/shared/measure/conformProbability.ts'

const entry = (id: string) => guardBand.values.find((value) => value.id === id)!

describe('conformProbability()', () => {
  it('gives the two-sided viscosity example of JCGM 106, 7.4', () => {
    expect(conformProbability(13.6, 1.8, null, 12.5, 16.3)).toBeCloseTo(
      entry('jcgm106-viscosity-two-sided').value as number,
      9,
    )
  })

  it('gives the upper-limit example of JCGM 106, 7.3', () => {
    expect(conformProbability(-5.47, 0.05, null, null, -5.4)).toBeCloseTo(
      entry('jcgm106-zener-upper-limit').value as number,
      9,
    )
  })

  it('leaves the published specific risk of 9.8 in 9..10', () => {
    expect(1 - conformProbability(9.8, 0.1, null, 9, 10)!).toBeCloseTo(
      entry('specific-risk-9.8').value as number,
      9,
    )
  })

  it('is one half at a single limit, whatever the uncertainty', () => {
    for (const dof of [null, 3, 12]) expect(conformProbability(2, 0.7, dof, null, 2)).toBeCloseTo(0.5, 12)
  })

  it('uses t for few degrees of freedom', () => {
    // scipy 1.17.1, stats.t.cdf(2, 5)
    expect(conformProbability(0, 1, 5, null, 2)).toBeCloseTo(0.9490302605850708, 10)
  })

  it('is certain without uncertainty', () => {
    expect(conformProbability(1, 0, null, 0, 1)).toBe(1)
    expect(conformProbability(1.01, 0, null, 0, 1)).toBe(0)
  })

  it('is null when value or uncertainty is missing or not finite', () => {
    expect(conformProbability(null, 1, null, 0, 1)).toBeNull()
    expect(conformProbability(NaN, 1, null, 0, 1)).toBeNull()
    expect(conformProbability(0.5, null, null, 0, 1)).toBeNull()
    expect(conformProbability(0.5, Infinity, null, 0, 1)).toBeNull()
  })
})

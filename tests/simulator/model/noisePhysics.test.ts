import { describe, expect, it } from 'vitest'
import {
  aWeightingPower,
  bandNoise,
  BOLTZMANN,
  capacitorNoisePower,
  chiSquareRatio,
  cornerHz,
  highPassPower,
  johnsonDensity,
  shuntNoisePower,
} from '../../../simulator/model/noisePhysics.ts'
import { makeRandom } from '../../../simulator/model/random.ts'
import reference from '../../reference/noise.json'

function valueOf(id: string): number {
  const entry = reference.values.find((each) => each.id === id)
  if (typeof entry?.value !== 'number') throw new Error(`no number ${id} in the reference`)
  return entry.value
}

describe('johnsonDensity()', () => {
  it('is 4kTR with the exact Boltzmann constant', () => {
    expect(BOLTZMANN).toBe(valueOf('boltzmann'))
    expect(Math.sqrt(johnsonDensity(1000, 300))).toBeCloseTo(valueOf('johnson-1000ohm-300K-1Hz'), 18)
    expect(Math.sqrt(johnsonDensity(1e6, 300))).toBeCloseTo(valueOf('johnson-1e+06ohm-300K-1Hz'), 16)
    expect(Math.sqrt(johnsonDensity(150, 300) * 20_000)).toBeCloseTo(
      valueOf('johnson-150ohm-300K-20000Hz'),
      15,
    )
  })
})

describe('capacitorNoisePower()', () => {
  it('gives 2.88 microvolt for 500 pF at 300 K (kT/C)', () => {
    expect(Math.sqrt(capacitorNoisePower(500e-12, 300)) * 1e6).toBeCloseTo(2.88, 2)
  })
})

describe('shuntNoisePower()', () => {
  it.each([1e5, 1e6, 1e7, 1e9])(
    'reaches kT/C over all frequencies, whatever the resistance (%d ohm)',
    (ohm) => {
      const all = shuntNoisePower(ohm, 500e-12, 300, 0, 1e12)
      expect(all / capacitorNoisePower(500e-12, 300)).toBeCloseTo(1, 4)
    },
  )

  it('is 4kTR B far below the corner', () => {
    expect(shuntNoisePower(1000, 1e-12, 300, 20, 20_020) / (johnsonDensity(1000, 300) * 20_000)).toBeCloseTo(
      1,
      6,
    )
  })

  it('is nothing for a short and for no number', () => {
    expect(shuntNoisePower(0, 500e-12, 300, 20, 20_000)).toBe(0)
    expect(shuntNoisePower(Number.NaN, 500e-12, 300, 20, 20_000)).toBe(0)
  })
})

describe('highPassPower()', () => {
  // 500 pF: -12 dB @1 Mohm, -2.2 @4.7 Mohm, -0.6 @10 Mohm at 82 Hz; 200 pF: -2.9 @10 Mohm (textbook arithmetic)
  it.each([
    [500, 1, -12],
    [500, 4.7, -2.2],
    [500, 10, -0.6],
    [200, 10, -2.9],
  ])('%d pF across %d Mohm loses %d dB at 82 Hz', (picofarad, megohm, lossDb) => {
    const corner = cornerHz(megohm * 1e6, picofarad * 1e-12)
    expect(10 * Math.log10(highPassPower(82, corner))).toBeCloseTo(lossDb, 0)
  })

  it.each([
    [200, 1, 796],
    [500, 10, 32],
    [1000, 1, 159],
    [2400, 10, 6.6],
  ])('%d pF across %d Mohm has its corner at %d Hz', (picofarad, megohm, hz) => {
    expect(cornerHz(megohm * 1e6, picofarad * 1e-12) / hz).toBeCloseTo(1, 1)
  })
})

describe('aWeightingPower()', () => {
  // IEC 61672-1 annex E evaluated at these frequencies
  it.each([
    [50, -30.275],
    [100, -19.145],
    [440, -4.0951],
    [1000, 0],
    [10_000, -2.4916],
  ])('at %d Hz is %d dB', (hz, db) => {
    expect(10 * Math.log10(aWeightingPower(hz))).toBeCloseTo(db, 2)
  })
})

describe('bandNoise()', () => {
  it('of white noise is density times bandwidth, with 2BT degrees of freedom', () => {
    const noise = bandNoise(() => 1e-16, 0.01)
    expect(noise.flatPower / (1e-16 * 19_980)).toBeCloseTo(1, 2)
    expect(noise.flatDof / (2 * 19_980 * 0.01)).toBeCloseTo(1, 2)
    expect(noise.aPower).toBeLessThan(noise.flatPower)
  })

  it('agrees with the closed form for a resistance across a capacitance', () => {
    const corner = cornerHz(1e7, 500e-12)
    const noise = bandNoise((f) => johnsonDensity(1e7, 300) / (1 + (f / corner) ** 2), 0.01)
    expect(noise.flatPower / shuntNoisePower(1e7, 500e-12, 300, 20, 20_000)).toBeCloseTo(1, 2)
    expect(noise.flatDof).toBeLessThan(5)
  })

  it('of silence is nothing', () => {
    expect(bandNoise(() => 0, 0.01)).toEqual({ flatPower: 0, aPower: 0, flatDof: 1, aDof: 1 })
  })
})

describe('chiSquareRatio()', () => {
  it.each([4, 40, 400])('has mean 1 and variance 2/dof for %d degrees of freedom', (dof) => {
    const random = makeRandom(3, 'chi')
    const ratios = Array.from({ length: 20_000 }, () => chiSquareRatio(dof, random.normal()))
    const mean = ratios.reduce((sum, x) => sum + x, 0) / ratios.length
    const variance = ratios.reduce((sum, x) => sum + (x - mean) ** 2, 0) / (ratios.length - 1)
    expect(Math.abs(mean - 1)).toBeLessThan(0.02)
    expect(variance / (2 / dof)).toBeGreaterThan(0.9)
    expect(variance / (2 / dof)).toBeLessThan(1.1)
  })
})

import { describe, expect, test } from 'vitest'
import { levelSplits } from '../../../../src/components/charts/chartParts.ts'
import { stringStroke } from '../../../../src/components/charts/stringStroke.ts'

const colors = {
  ink: 'ink',
  quiet: 'quiet',
  hairline: 'hairline',
  edge: 'edge',
  action: 'action',
  panel: 'panel',
  fail: 'fail',
}

describe('levelSplits()', () => {
  test('puts whole twenties on the axis', () => {
    expect(levelSplits(-110, 4, 'dBV')).toEqual([-100, -80, -60, -40, -20, 0])
  })

  test('puts them where dBu is whole, 2.22 dB lower on the dBV scale', () => {
    const splits = levelSplits(-110, 4, 'dBu')
    expect(splits).toHaveLength(6)
    expect(splits.at(-1)).toBeCloseTo(-2.218, 3)
    expect(splits[0]).toBeCloseTo(-102.218, 3)
  })
})

describe('stringStroke()', () => {
  test('draws no two strings alike, apart from colour too', () => {
    const drawn = [1, 2, 3, 4, 5, 6].map((no) => {
      const { stroke, width, dash } = stringStroke(no, false, colors)
      return JSON.stringify([stroke, width, dash])
    })
    expect(new Set(drawn).size).toBe(6)
  })

  test('gives the string asked for the action colour and more weight, and the jack alone ink', () => {
    expect(stringStroke(2, true, colors)).toEqual({ stroke: 'action', width: 2.4, dash: [8, 3] })
    expect(stringStroke(null, false, colors).stroke).toBe('ink')
  })
})

import { describe, expect, it } from 'vitest'
import { SampleHistory } from '../../../simulator/signal/sampleHistory.ts'

const counted = (from: number, count: number) => Float64Array.from({ length: count }, (_, i) => from + i)

describe('SampleHistory', () => {
  it('finds samples by their number, also around the end of its ring', () => {
    const history = new SampleHistory(10)
    for (let at = 0; at < 28; at += 7) history.push(counted(at, 7), 7)
    expect(history.read(18, 10)).toEqual(counted(18, 10))
    expect(history.read(20, 3)).toEqual(counted(20, 3))
  })

  it('gives null for what is gone, not there yet, or longer than it keeps', () => {
    const history = new SampleHistory(10)
    history.push(counted(0, 12), 12)
    expect(history.read(1, 5)).toBeNull()
    expect(history.read(8, 5)).toBeNull()
    expect(history.read(-1, 2)).toBeNull()
    expect(history.read(2, 11)).toBeNull()
    expect(history.read(2, 10)).toEqual(counted(2, 10))
  })
})

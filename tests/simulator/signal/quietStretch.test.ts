import { describe, expect, it } from 'vitest'
import { SILENCE_MDB } from '../../../src/shared/contract/quantities.ts'
import { QuietStretch } from '../../../simulator/signal/quietStretch.ts'

/** Frames of 10 ms at which a stretch of 2 s was quiet, looked at every 400 ms. */
function quietAt(frames: readonly (readonly number[])[]): number[] {
  const stretch = new QuietStretch(frames[0]!.length, 10, 2000, 400)
  return frames.flatMap((levels, frameNo) => (stretch.push(levels) ? [frameNo] : []))
}
const even = (frames: number, ...levels: number[]) => Array.from({ length: frames }, () => levels)

describe('QuietStretch', () => {
  it('is quiet after a whole even stretch, and again every 400 ms', () => {
    expect(quietAt(even(300, -80_000, -90_000))).toEqual([199, 239, 279])
    expect(quietAt(even(199, -80_000))).toEqual([])
  })

  it('begins again after a touch on any channel', () => {
    const frames = [
      ...even(50, -80_000, -80_000),
      ...even(5, -80_000, -40_000),
      ...even(300, -80_000, -80_000),
    ]
    expect(quietAt(frames)[0]).toBe(259)
  })

  it('does not take a string that dies away for quiet', () => {
    expect(quietAt(Array.from({ length: 400 }, (_, i) => [-30_000 - 30 * i]))).toEqual([])
  })

  it('takes digital silence as quiet', () => {
    expect(quietAt(even(200, SILENCE_MDB))).toEqual([199])
  })
})

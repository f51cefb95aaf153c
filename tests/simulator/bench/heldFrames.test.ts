import { describe, expect, it } from 'vitest'
import { makeHeldFrames } from '../../../simulator/bench/heldFrames.ts'
import { MAX_BATCH_EVENTS } from '../../../src/shared/contract/frames.ts'
import type { BenchEvent } from '../../../src/shared/contract/frames.ts'
import { numberedFrame } from '../../helpers/countingSource.ts'

function pedals(frame: number, count: number): BenchEvent[] {
  return Array.from({ length: count }, () => ({ kind: 'pedal', frame, startTenthMs: 0, durationTenthMs: 1 }))
}

function filled(first: number, count: number) {
  const held = makeHeldFrames(first)
  for (let i = 0; i < count; i++) held.push({ frame: numberedFrame(first + i), events: [] })
  return held
}

describe('makeHeldFrames()', () => {
  it('counts from its first number on', () => {
    const held = filled(40, 5)
    expect([held.first(), held.end()]).toEqual([40, 45])
    expect(held.batchFrom(42, 10).frames.map((frame) => frame.currentUa)).toEqual([42, 43, 44])
  })

  it('forgets what is safe and gives it out no more', () => {
    const held = filled(0, 10)
    held.dropBelow(4)
    expect(held.first()).toBe(4)
    expect(held.batchFrom(3, 2).frames).toEqual([])
    held.dropBelow(2)
    expect(held.first()).toBe(4)
    held.dropBelow(99)
    expect([held.first(), held.end()]).toEqual([10, 10])
  })

  it('keeps its numbers over thousands of forgotten frames', () => {
    const held = makeHeldFrames(0)
    for (let i = 0; i < 20_000; i++) {
      held.push({ frame: numberedFrame(i), events: [] })
      held.dropBelow(i - 3)
    }
    expect([held.first(), held.end()]).toEqual([19_996, 20_000])
    expect(held.batchFrom(19_998, 5).frames.map((frame) => frame.currentUa)).toEqual([19_998, 19_999])
  })

  it('cuts a batch before it holds more events than the protocol allows', () => {
    const held = makeHeldFrames(0)
    for (let i = 0; i < 5; i++) held.push({ frame: numberedFrame(i), events: pedals(i, 150) })
    const batch = held.batchFrom(0, 5)
    expect(batch.frames).toHaveLength(2)
    expect(batch.events.length).toBeLessThanOrEqual(MAX_BATCH_EVENTS)
    expect(held.batchFrom(2, 5).frames[0]!.currentUa).toBe(2)
  })
})

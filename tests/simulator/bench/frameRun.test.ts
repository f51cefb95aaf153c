import { describe, expect, it } from 'vitest'
import { makeFrameRun } from '../../../simulator/bench/frameRun.ts'
import { MAX_BATCH_FRAMES } from '../../../src/shared/contract/frames.ts'
import { buildOrder, makeCountingSource } from '../../helpers/countingSource.ts'

describe('makeFrameRun()', () => {
  it('makes a frame for each frame length of time and loses no fraction', () => {
    const run = makeFrameRun(makeCountingSource(), buildOrder())
    for (let i = 0; i < 10; i++) run.elapse(7)
    expect(run.nextBatch()!.frames).toHaveLength(7)
  })

  it('never sends more than the window or the protocol allows', () => {
    const run = makeFrameRun(makeCountingSource(), buildOrder({ window: 30 }))
    run.elapse(5000)
    expect(run.nextBatch()!.frames).toHaveLength(30)
    run.setWindow(10_000)
    expect(run.nextBatch()!.frames).toHaveLength(MAX_BATCH_FRAMES)
  })

  it('keeps a fast model within 0.4 s of what the server has taken', () => {
    const run = makeFrameRun(makeCountingSource({ timeScale: 50 }), buildOrder())
    run.elapse(1000)
    expect(run.nextBatch()!.frames).toHaveLength(40)
    run.accepted(40, 0, 200)
    run.make()
    expect(run.nextBatch()).toMatchObject({ from: 40 })
    expect(run.nextBatch()!.frames).toHaveLength(40)
  })

  it('gives a recording as fast as the server takes it and ends with it', () => {
    const run = makeFrameRun(makeCountingSource({ realTime: false, lastFrame: 499 }), buildOrder())
    let next = 0
    run.make()
    for (let batch = run.nextBatch(); batch; batch = run.nextBatch()) {
      expect(batch.from).toBe(next)
      next += batch.frames.length
      run.accepted(next, next, 200)
      run.make()
    }
    expect(next).toBe(500)
    expect(run.hasEnded()).toBe(true)
  })

  it('tells a discontinuity after a restart in the middle of a run', () => {
    const run = makeFrameRun(makeCountingSource(), buildOrder({ from: 700 }))
    run.elapse(50)
    const batch = run.nextBatch()!
    expect(batch.from).toBe(700)
    expect(batch.events).toEqual([
      { kind: 'discontinuity', frame: 700, startTenthMs: 70_000, durationTenthMs: 0 },
    ])
  })

  it('tells none for a recording, whose frames are the same each time', () => {
    const source = makeCountingSource({ repeatable: true })
    const run = makeFrameRun(source, buildOrder({ from: 700 }))
    run.elapse(50)
    expect(run.nextBatch()!.events).toEqual([])
  })

  it('measures no further when it holds too much, and marks the break when it goes on', () => {
    const run = makeFrameRun(makeCountingSource(), buildOrder(), 100)
    run.elapse(5000)
    run.accepted(100, 100, 200)
    run.elapse(50)
    const batch = run.nextBatch()!
    expect(batch.from).toBe(100)
    expect(batch.frames).toHaveLength(5)
    expect(batch.events.map((event) => event.kind)).toEqual(['discontinuity'])
  })

  it('goes on from any frame that it holds and from no other', () => {
    const run = makeFrameRun(makeCountingSource(), buildOrder())
    run.elapse(1000)
    run.accepted(100, 60, 200)
    expect(run.heldFrom()).toBe(60)
    expect(run.goOnFrom(59)).toBe(false)
    expect(run.goOnFrom(101)).toBe(false)
    expect(run.goOnFrom(60)).toBe(true)
    expect(run.nextBatch()).toMatchObject({ from: 60 })
  })

  it('asks a pipe that has nothing yet again later', () => {
    let there = 3
    const source = makeCountingSource({
      next: (frameNo) => (frameNo < there ? { frame: makeFrame(frameNo), events: [] } : ('notYet' as const)),
    })
    const run = makeFrameRun(source, buildOrder())
    run.elapse(100)
    expect(run.nextBatch()!.frames).toHaveLength(3)
    there = 8
    run.elapse(10)
    expect(run.nextBatch()!.frames).toHaveLength(8)
  })
})

function makeFrame(frameNo: number) {
  const step = makeCountingSource().next(frameNo)
  if (typeof step === 'string') throw new Error('a counting source always has a frame')
  return step.frame
}

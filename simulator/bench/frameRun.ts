import { MAX_BATCH_FRAMES } from '../../src/shared/contract/frames.ts'
import type { FrameBatch, RunOrder } from '../../src/shared/contract/frames.ts'
import type { BenchSource, SourceStep } from '../sources/source.ts'
import { makeHeldFrames } from './heldFrames.ts'
import type { HeldFrames } from './heldFrames.ts'

/** A stalled bench makes up for at most so much time, s; what is older is lost. */
const CATCH_UP_S = 60
/** A source that runs faster than the clock stays so close to the server that its prompts are never stale, s. */
const FAST_AHEAD_S = 0.4
/** Frames that are kept for a server that is away; beyond it the bench measures no further. Twenty minutes at 10 ms. */
export const MOST_HELD_FRAMES = 120_000

/** One run on the bench's side: makes frames as time passes and keeps them until the server calls them safe. */
export interface FrameRun {
  readonly id: string
  /** the source has nothing more to give */
  hasEnded(): boolean
  /** first frame that can still be sent */
  heldFrom(): number
  /** the server says that the run takes no more frames */
  close(): void
  isClosed(): boolean
  /** time has passed: make the frames that are due */
  elapse(ms: number): void
  /** make frames out of time that has already passed */
  make(): void
  nextBatch(): FrameBatch | null
  accepted(next: number, committed: number, window: number): void
  committed(committed: number): void
  /** the server wants this frame next; false: it is not held any more */
  goOnFrom(frameNo: number): boolean
  setWindow(window: number): void
}

export function makeFrameRun(source: BenchSource, order: RunOrder, mostHeld = MOST_HELD_FRAMES): FrameRun {
  const held: HeldFrames = makeHeldFrames(order.from)
  let serverNext = order.from
  let sendNext = order.from
  let window = order.window
  let creditMs = 0
  let ended = false
  let closed = false
  // what an earlier program held of this run is gone, unless the source can give it again
  let breakWaits = order.from > 0 && !source.repeatable

  function due(): number {
    if (!source.realTime) return serverNext + 2 * MAX_BATCH_FRAMES - held.end()
    const scale = source.timeScale ?? 1
    const ahead =
      scale > 1 ? serverNext + Math.ceil((FAST_AHEAD_S * 1000) / source.frameMs) : Number.MAX_SAFE_INTEGER
    return Math.min(Math.floor(creditMs / source.frameMs), ahead - held.end())
  }

  function keep(step: SourceStep): void {
    const frame = held.end()
    if (breakWaits) {
      breakWaits = false
      const startTenthMs = frame * source.frameMs * 10
      step.events.unshift({ kind: 'discontinuity', frame, startTenthMs, durationTenthMs: 0 })
    }
    held.push(step)
  }

  function make(): void {
    if (closed || ended) return
    for (let count = due(); count > 0; count--) {
      if (held.end() - held.first() >= mostHeld) {
        breakWaits = true
        creditMs = 0
        return
      }
      const step = source.next(held.end())
      if (step === 'notYet') return
      if (step === 'ended') {
        ended = true
        return
      }
      keep(step)
      creditMs = Math.max(0, creditMs - source.frameMs)
    }
  }

  return {
    id: order.run,
    hasEnded: () => ended,
    heldFrom: () => held.first(),
    close() {
      closed = true
    },
    isClosed: () => closed,
    elapse(ms) {
      const scale = source.timeScale ?? 1
      creditMs = Math.min(CATCH_UP_S * 1000 * scale, creditMs + ms * scale)
      make()
    },
    make,
    nextBatch() {
      const most = Math.min(MAX_BATCH_FRAMES, Math.max(1, window))
      const { frames, events } = held.batchFrom(sendNext, most)
      return closed || frames.length === 0 ? null : { run: order.run, from: sendNext, frames, events }
    },
    accepted(next, committed, newWindow) {
      serverNext = next
      sendNext = Math.max(next, held.first())
      window = newWindow
      held.dropBelow(committed)
    },
    committed(committed) {
      held.dropBelow(committed)
    },
    goOnFrom(frameNo) {
      if (frameNo < held.first() || frameNo > held.end()) return false
      closed = false
      serverNext = frameNo
      sendNext = frameNo
      return true
    },
    setWindow(newWindow) {
      window = newWindow
    },
  }
}

import { MAX_BATCH_EVENTS } from '../../src/shared/contract/frames.ts'
import type { BenchEvent, Frame } from '../../src/shared/contract/frames.ts'
import type { SourceStep } from '../sources/source.ts'

/** Frames that the server has not called safe yet, numbered without a gap. */
export interface HeldFrames {
  /** number of the oldest frame that is held, and of the one after the newest */
  first(): number
  end(): number
  push(step: SourceStep): void
  /** forget the frames below this number: they are safe */
  dropBelow(frameNo: number): void
  /** at most so many frames from a number on, and no more events than a batch may hold */
  batchFrom(frameNo: number, most: number): { frames: Frame[]; events: BenchEvent[] }
}

/** Forgotten places at the front are given back when there are so many of them. */
const COMPACT_FROM = 4096

export function makeHeldFrames(firstFrameNo: number): HeldFrames {
  let steps: SourceStep[] = []
  let gone = 0
  let base = firstFrameNo

  return {
    first: () => base + gone,
    end: () => base + steps.length,
    push(step) {
      steps.push(step)
    },
    dropBelow(frameNo) {
      gone = Math.max(gone, Math.min(frameNo - base, steps.length))
      if (gone < COMPACT_FROM) return
      steps = steps.slice(gone)
      base += gone
      gone = 0
    },
    batchFrom(frameNo, most) {
      const frames: Frame[] = []
      const events: BenchEvent[] = []
      const start = frameNo - base
      if (start < gone) return { frames, events }
      for (let i = start; i < Math.min(steps.length, start + most); i++) {
        const step = steps[i]!
        if (frames.length > 0 && events.length + step.events.length > MAX_BATCH_EVENTS) break
        frames.push(step.frame)
        events.push(...step.events.slice(0, MAX_BATCH_EVENTS))
      }
      return { frames, events }
    },
  }
}

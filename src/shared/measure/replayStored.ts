import type { BenchEvent, Frame } from '../contract/frames.ts'
import type { RunAction, RunSetup } from '../contract/runs.ts'
import { methods, type MethodCode } from './method.ts'
import type { RunState } from './runState.ts'

export interface Replayed {
  state: RunState
  /** frames taken */
  frames: number
  /** actions whose frame has not come yet */
  left: RunAction[]
}

/**
 * A run's state from what is stored of it, by the method that it was judged with: each action is applied after the
 * frames below its frame number, in the order of `no`; each event goes with its frame, in the order that it came.
 * Actions beyond the last frame apply at the end when `atEnd`, else they are given back. Throws RangeError for a
 * method that is not known.
 */
export function replayStored(
  setup: RunSetup,
  frames: Iterable<Frame>,
  events: readonly BenchEvent[],
  actions: readonly RunAction[],
  atEnd: boolean,
): Replayed {
  const code = methods[setup.method]
  if (!code) throw new RangeError(`method ${setup.method} is not known`)
  const state = code.startRun(setup)
  const left = [...actions].sort((a, b) => a.no - b.no)
  const actUpTo = (frame: number) => {
    while (left[0] && left[0].frame <= frame) applyStored(code, state, left.shift()!)
  }
  const eventsOf = eventsByFrame(events)
  let frameNo = 0
  for (const frame of frames) {
    actUpTo(frameNo)
    code.takeFrame(state, frame, eventsOf.get(frameNo) ?? NO_EVENTS)
    frameNo++
  }
  actUpTo(atEnd ? Infinity : frameNo)
  return { state, frames: frameNo, left }
}

/**
 * A stored action takes its place again. After a break in which a bench lost frames it may not fit there any more:
 * then it has no effect, now and whenever the run is computed again.
 */
export function applyStored(code: MethodCode, state: RunState, action: RunAction): void {
  if (code.refusalOf(state, action.action) === null) code.takeAction(state, action)
}

/** Events of each frame, in the order that they came. */
export function eventsByFrame(events: readonly BenchEvent[]): Map<number, BenchEvent[]> {
  const map = new Map<number, BenchEvent[]>()
  for (const event of events) {
    const there = map.get(event.frame)
    if (there) there.push(event)
    else map.set(event.frame, [event])
  }
  return map
}

const NO_EVENTS: readonly BenchEvent[] = []

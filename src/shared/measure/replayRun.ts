import type { BenchEvent, Frame } from '../contract/frames.ts'
import type { RunAction, RunSetup } from '../contract/runs.ts'
import { methods } from './method.ts'
import type { RunState } from './runState.ts'

/**
 * Measures and judges a run again from what is stored of it: each action is applied after the frames below its frame
 * number, in the order of `no`; each event goes with its frame, in the order that it came. Throws RangeError for a
 * method that is not known.
 */
export function replayRun(
  setup: RunSetup,
  frames: Iterable<Frame>,
  events: readonly BenchEvent[],
  actions: readonly RunAction[],
): RunState {
  const code = methods[setup.method]
  if (!code) throw new RangeError(`method ${setup.method} is not known`)
  const state = code.startRun(setup)
  const inOrder = [...actions].sort((a, b) => a.no - b.no)
  const eventsOf = new Map<number, BenchEvent[]>()
  for (const event of events) {
    const list = eventsOf.get(event.frame)
    if (list) list.push(event)
    else eventsOf.set(event.frame, [event])
  }
  let frameNo = 0
  let nextAction = 0
  const actUpTo = (frame: number) => {
    while (nextAction < inOrder.length && inOrder[nextAction]!.frame <= frame) {
      code.takeAction(state, inOrder[nextAction++]!)
    }
  }
  for (const frame of frames) {
    actUpTo(frameNo)
    code.takeFrame(state, frame, eventsOf.get(frameNo) ?? NO_EVENTS)
    frameNo++
  }
  actUpTo(Infinity)
  return state
}

const NO_EVENTS: readonly BenchEvent[] = []

import type { BenchEvent, Frame } from '../../src/shared/contract/frames.ts'
import type { RunAction, RunSetup } from '../../src/shared/contract/runs.ts'
import { methods } from '../../src/shared/measure/method.ts'
import type { MethodCode } from '../../src/shared/measure/method.ts'
import type { RunState } from '../../src/shared/measure/runState.ts'

const NO_EVENTS: readonly BenchEvent[] = []

/**
 * A run's state from its stored inputs, by the method that it was judged with. An action applies after the frames
 * below its frame; actions beyond the last frame apply at the end when `atEnd`, else they are given back.
 */
export function replayRun(
  setup: RunSetup,
  trace: Iterable<{ frames: readonly Frame[]; events: readonly BenchEvent[] }>,
  actions: readonly RunAction[],
  atEnd: boolean,
): { state: RunState; frames: number; left: RunAction[] } {
  const method = methods[setup.method]
  if (!method) throw new Error(`method ${setup.method} is not part of this program`)
  const state = method.startRun(setup)
  const waiting = [...actions].sort((a, b) => a.no - b.no)
  let frameNo = 0
  for (const stretch of trace) {
    const events = byFrame(stretch.events)
    for (const frame of stretch.frames) {
      while (waiting[0] && waiting[0].frame <= frameNo) applyStored(method, state, waiting.shift()!)
      method.takeFrame(state, frame, events.get(frameNo) ?? NO_EVENTS)
      frameNo++
    }
  }
  while (waiting[0] && (atEnd || waiting[0].frame <= frameNo)) applyStored(method, state, waiting.shift()!)
  return { state, frames: frameNo, left: waiting }
}

/**
 * A stored action takes its place again. After a break in which a bench lost frames it may not fit there any more:
 * then it has no effect, now and whenever the run is computed again.
 */
export function applyStored(method: MethodCode, state: RunState, action: RunAction): void {
  if (method.refusalOf(state, action.action) === null) method.takeAction(state, action)
}

export function byFrame(events: readonly BenchEvent[]): Map<number, BenchEvent[]> {
  const map = new Map<number, BenchEvent[]>()
  for (const event of events) {
    const there = map.get(event.frame)
    if (there) there.push(event)
    else map.set(event.frame, [event])
  }
  return map
}

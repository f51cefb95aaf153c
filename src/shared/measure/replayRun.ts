import type { BenchEvent, Frame } from '../contract/frames.ts'
import type { RunAction, RunSetup } from '../contract/runs.ts'
import { replayStored } from './replayStored.ts'
import type { RunState } from './runState.ts'

/** Measures and judges an ended run again from what is stored of it, as replayStored() does, to its end. */
export function replayRun(
  setup: RunSetup,
  frames: Iterable<Frame>,
  events: readonly BenchEvent[],
  actions: readonly RunAction[],
): RunState {
  return replayStored(setup, frames, events, actions, true).state
}

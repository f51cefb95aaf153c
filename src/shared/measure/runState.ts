import type { BenchEvent, Frame } from '../contract/frames.ts'
import type { MeasuredRun, RunPhase } from '../contract/measured.ts'
import type { RunAction, RunActionBody, RunSetup } from '../contract/runs.ts'
import { applyAction, refusalOf as refusal } from './actions.ts'
import { buildView } from './buildView.ts'
import { foldFrame } from './phases.ts'
import { createState, isFinished as finished, type RunState } from './state.ts'

export type { RunState } from './state.ts'
export { MeasureRefusal } from './MeasureRefusal.ts'
export { promptOf } from './buildView.ts'
export { noiseStretchMsOf } from './runPlan.ts'

/** State of a run before its first frame. The set-up is kept, not copied: do not change it. */
export function startRun(setup: RunSetup): RunState {
  return createState(setup)
}

/**
 * Folds the next frame into the state, in place: the n-th call is frame n, `events` are those sent with it, in their
 * order. Constant work; nothing after the run has finished.
 */
export function takeFrame(state: RunState, frame: Frame, events: readonly BenchEvent[]): void {
  foldFrame(state, frame, events)
}

/** Applies a person's action between frames. Throws MeasureRefusal('run.action-not-now') when it does not fit. */
export function takeAction(state: RunState, action: RunAction): void {
  applyAction(state, action)
}

/** Why an action would be refused now, in words for the person; null when it fits. Changes nothing. */
export function refusalOf(state: RunState, action: RunActionBody): string | null {
  return refusal(state, action)
}

/** Everything measured and judged so far, as the contract shows it; no value in it is NaN or infinite. */
export function viewRun(state: RunState): MeasuredRun {
  return buildView(state)
}

/** A number that grows whenever phase, prompt, a pluck, a reading, a result or progress in tenths changed. */
export function changeCount(state: RunState): number {
  return state.changes
}

export function phaseOf(state: RunState): RunPhase {
  return state.phase
}

/** The run is done or stopped: it takes no more frames or actions. */
export function isFinished(state: RunState): boolean {
  return finished(state)
}

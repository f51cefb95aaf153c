import type { RunState } from './state.ts'

/** ms since the present phase began. */
export function elapsedMs(state: RunState): number {
  return (state.frames - state.phaseFromFrame) * state.setup.frameMs
}

/** ms since the plug was seen in, while the run settles. */
export function settledMs(state: RunState): number {
  return state.settle.frames * state.setup.frameMs
}

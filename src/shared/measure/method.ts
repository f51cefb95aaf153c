import type { BenchEvent, Frame } from '../contract/frames.ts'
import type { MeasuredRun, PromptKey, RunPhase } from '../contract/measured.ts'
import type { RunAction, RunActionBody, RunSetup } from '../contract/runs.ts'
import {
  changeCount,
  isFinished,
  phaseOf,
  promptOf,
  refusalOf,
  startRun,
  takeAction,
  takeFrame,
  viewRun,
  type RunState,
} from './runState.ts'

export * from './constants.ts'

/** The method that new runs are measured and judged by. */
export const METHOD = 1

/** What a method is to whoever runs it. */
export interface MethodCode {
  startRun(setup: RunSetup): RunState
  takeFrame(state: RunState, frame: Frame, events: readonly BenchEvent[]): void
  takeAction(state: RunState, action: RunAction): void
  viewRun(state: RunState): MeasuredRun
  /** why an action would be refused now, in words for the person; null when it fits */
  refusalOf(state: RunState, action: RunActionBody): string | null
  /** grows with every change that a screen shows */
  changeCount(state: RunState): number
  isFinished(state: RunState): boolean
  phaseOf(state: RunState): RunPhase
  /** what is asked for now, without working out the whole view */
  promptOf(state: RunState): { prompt: PromptKey; stringNo: number | null }
}

/** Every method that a stored run can name. A new method gets a new entry; the old code stays callable. */
export const methods: Record<number, MethodCode> = {
  1: {
    startRun,
    takeFrame,
    takeAction,
    viewRun,
    refusalOf,
    changeCount,
    isFinished,
    phaseOf,
    promptOf,
  },
}

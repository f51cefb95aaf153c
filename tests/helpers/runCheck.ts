import type { BenchEvent, Frame } from '../../src/shared/contract/frames.ts'
import type { MeasuredRun, RuleResult } from '../../src/shared/contract/measured.ts'
import { MeasuredRun as MeasuredRunSchema } from '../../src/shared/contract/measured.ts'
import type { RuleId } from '../../src/shared/contract/rules.ts'
import type { RunAction, RunSetup } from '../../src/shared/contract/runs.ts'
import { replayRun } from '../../src/shared/measure/replayRun.ts'
import { viewRun } from '../../src/shared/measure/runState.ts'

export interface Trace {
  frames: readonly Frame[]
  events: readonly BenchEvent[]
}

/** Measures a whole trace and gives its view, checked against the contract. */
export function runCheck(setup: RunSetup, trace: Trace, actions: readonly RunAction[] = []): MeasuredRun {
  return MeasuredRunSchema.parse(viewRun(replayRun(setup, trace.frames, trace.events, actions)))
}

export function resultOf(view: MeasuredRun, rule: RuleId, stringNo: number | null = null): RuleResult {
  const result = view.results.find((one) => one.rule === rule && one.stringNo === stringNo)
  if (!result) throw new Error(`no result of ${rule} ${stringNo ?? ''}`)
  return result
}

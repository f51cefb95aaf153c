import type { RunAction, RunActionBody } from '../contract/runs.ts'
import { unitOf } from './unitOf.ts'
import { capabilitiesCover } from './capabilitiesCover.ts'
import { isEnterableByHand } from './isEnterableByHand.ts'
import { MeasureRefusal } from './MeasureRefusal.ts'
import { backToStrings, goOn, missingEntries, sayNoSignal, stopRun } from './phases.ts'
import { refusalToGoOn } from './refusalToGoOn.ts'
import { sheetRuleOf } from './runPlan.ts'
import { isFinished, type RunState } from './state.ts'
import { repeatString } from './stringTally.ts'

/** Why an action does not fit the present step, for the person; null when it fits. Changes nothing. */
export function refusalOf(state: RunState, action: RunActionBody): string | null {
  if (isFinished(state)) return 'The run has ended.'
  switch (action.kind) {
    case 'goOn':
      return refusalToGoOn(state)
    case 'noSignal':
      if (state.phase !== 'strings') return 'No string is being asked for.'
      return tallyOf(state, action.stringNo).state === 'todo' ? null : 'This string is finished.'
    case 'repeatString':
      return refusalToRepeat(state, action.stringNo)
    case 'enterValue':
      return refusalToEnter(state, action)
    case 'changePerson':
    case 'stop':
      return null
  }
}

/** Applies an action between frames. Throws MeasureRefusal('run.action-not-now') when it does not fit. */
export function applyAction(state: RunState, { action, person }: RunAction): void {
  const refusal = refusalOf(state, action)
  if (refusal !== null) throw new MeasureRefusal('run.action-not-now', refusal)
  state.changes++
  switch (action.kind) {
    case 'goOn':
      return goOn(state, 'person')
    case 'noSignal':
      return sayNoSignal(state, tallyOf(state, action.stringNo))
    case 'repeatString':
      repeatString(tallyOf(state, action.stringNo), state.plan, action.reason)
      state.levelChanges++
      return backToStrings(state)
    case 'enterValue':
      return enterValue(state, action, person)
    case 'changePerson':
      state.person = action.person
      return
    case 'stop':
      return stopRun(state)
  }
}

function tallyOf(state: RunState, stringNo: number) {
  return state.strings[stringNo - 1]!
}

function refusalToRepeat(state: RunState, stringNo: number): string | null {
  const tally = tallyOf(state, stringNo)
  if (!['strings', 'wiggleReady', 'entry'].includes(state.phase))
    return 'Strings are repeated while strings are asked for.'
  if (!state.plan.phases.includes('strings')) return 'This check has no strings.'
  if (tally.repeated) return 'This string was repeated already; once is allowed.'
  if (tally.tries === 0) return 'This string has no plucks yet.'
  return state.pluck === null ? null : 'A pluck is just being measured.'
}

function refusalToEnter(
  state: RunState,
  action: Extract<RunActionBody, { kind: 'enterValue' }>,
): string | null {
  if (sheetRuleOf(state.setup, action.rule) === undefined) return 'The threshold sheet does not ask for this.'
  if (capabilitiesCover(action.rule, state.setup.capabilities)) return 'This bench measures it itself.'
  if (!isEnterableByHand(action.rule) || action.stringNo !== null) return 'This cannot be read from a meter.'
  if (!Number.isFinite(action.value) || !Number.isFinite(action.u)) return 'The value is not a number.'
  if (unitOf(action.rule) === 'yes/no' && action.value !== 0 && action.value !== 1)
    return 'Enter 1 for yes or 0 for no.'
  return null
}

/** A value entered again replaces the earlier one; both stay in the run's actions. */
function enterValue(
  state: RunState,
  action: Extract<RunActionBody, { kind: 'enterValue' }>,
  person: string,
): void {
  const { rule, stringNo, value, u, meter } = action
  state.entered = state.entered.filter((entry) => entry.rule !== rule || entry.stringNo !== stringNo)
  state.entered.push({ rule, stringNo, value, u, meter, person })
  if (state.phase === 'entry' && missingEntries(state).length === 0) goOn(state, 'person')
}

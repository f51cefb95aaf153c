import type { DropReason, Pluck, StringState } from '../contract/measured.ts'
import type { ThresholdSheet } from '../contract/thresholds.ts'
import { NO_SIGNAL_TIMES } from './constants.ts'
import { sampleSd } from './sampleSd.ts'
import type { RunPlan } from './runPlan.ts'

/** A pluck with what only the judging needs of it. */
export interface MeasuredPluck extends Pluck {
  /** A-weighted level over the same window, dBV; null when not measured */
  rawADb: number | null
  /** how fast the level fell in the window, dB/s; null when it could not be fitted */
  decayDbPerS: number | null
}

/** How far one string has come. */
export interface StringTally {
  stringNo: number
  state: StringState
  accepted: MeasuredPluck[]
  wanted: number
  tries: number
  noSignalCount: number
  repeated: boolean
  repeatReason: string | null
}

export function createStringTally(stringNo: number, plan: RunPlan): StringTally {
  return {
    stringNo,
    state: 'todo',
    accepted: [],
    wanted: plan.n,
    tries: 0,
    noSignalCount: 0,
    repeated: false,
    repeatReason: null,
  }
}

/** Sample standard deviation of the accepted plucks, dB; null for fewer than two. */
export function acceptedSd(tally: StringTally): number | null {
  return sampleSd(tally.accepted.map((pluck) => pluck.levelDb!))
}

/**
 * Decides what a string still needs after a try: one more pluck while the scatter is too large and the maximum is
 * not reached; silent after three tries that were not heard and none that was; done, or out of tries.
 */
export function refreshString(tally: StringTally, plan: RunPlan, sheet: ThresholdSheet): void {
  const count = tally.accepted.length
  if (tally.noSignalCount >= NO_SIGNAL_TIMES && count === 0) {
    tally.state = 'silent'
    return
  }
  if (count >= tally.wanted && count < plan.nMax && !(acceptedSd(tally)! <= sheet.plucks.largestSDb)) {
    tally.wanted = count + 1
  }
  if (count >= tally.wanted) tally.state = 'done'
  else tally.state = tally.tries >= plan.triesMax ? 'triesUsed' : 'todo'
}

/** Asks a finished string for one more pluck, if it may still have one; says whether. */
export function askForOneMore(tally: StringTally, plan: RunPlan): boolean {
  const count = tally.accepted.length
  if (tally.state !== 'done' || count >= plan.nMax || tally.tries >= plan.triesMax) return false
  tally.wanted = count + 1
  tally.state = 'todo'
  return true
}

/** Sets a string's accepted plucks aside and starts its tries again. The plucks stay in the run's list. */
export function repeatString(tally: StringTally, plan: RunPlan, reason: string): void {
  const setAside: DropReason = 'setAside'
  for (const pluck of tally.accepted) pluck.dropped = setAside
  tally.accepted = []
  tally.state = 'todo'
  tally.wanted = plan.n
  tally.tries = 0
  tally.noSignalCount = 0
  tally.repeated = true
  tally.repeatReason = reason
}

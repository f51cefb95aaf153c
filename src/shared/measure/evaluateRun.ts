import { balanceDb, referenceOf, type Reference } from './balanceDb.ts'
import { balanceUncertainty, type IndependentParts } from './balanceUncertainty.ts'
import { CENSOR_DB, DECAY_FALLBACK_DB_PER_S, PATTERN_LEAST_INSTRUMENTS } from './constants.ts'
import { levelUncertainty } from './levelUncertainty.ts'
import { meanOf } from './meanOf.ts'
import { pooledSd, type PooledSd } from './pooledSd.ts'
import { rangeDb } from './rangeDb.ts'
import { rangeStepUncertainty, type SimulatedSpread } from './rangeStepUncertainty.ts'
import { sampleSd } from './sampleSd.ts'
import { stepDb } from './stepDb.ts'
import { channelOf, type RunState } from './state.ts'
import type { StringTally } from './stringTally.ts'
import { combinedU, type UncertaintyPart } from './welchSatterthwaite.ts'

/** A value with what stands behind it. parts empty: no uncertainty is known. */
export interface Evaluated {
  value: number | null
  atMost: boolean
  n: number
  parts: UncertaintyPart[]
}

export interface EvaluatedString {
  tally: StringTally
  level: Evaluated
  sDb: number | null
  balance: Evaluated
  separation: Evaluated
  /** level before the noise is taken off, flat and A, dBV, mean over the accepted plucks */
  rawDb: number | null
  rawADb: number | null
  independent: (IndependentParts & { start: UncertaintyPart }) | null
}

/** Levels, balances and what follows from them, of a run so far. */
export interface EvaluatedRun {
  strings: EvaluatedString[]
  reference: Reference
  meanLevel: Evaluated
  range: Evaluated
  step: Evaluated
  /** uncertainty of range and step, simulated when first asked for; null without six levels */
  simulated: () => { range: SimulatedSpread; step: SimulatedSpread } | null
  /** range and step are at least this, when a string is censored; null: not known */
  leastRangeDb: number | null
  leastStepDb: number | null
}

export const NOTHING: Evaluated = { value: null, atMost: false, n: 0, parts: [] }

/** The model's pattern if it is in force: from at least 10 good instruments; null: balance rules only advise. */
export function patternInForce(sheet: RunState['setup']['sheet']): number[] | null {
  const { patternDb, patternInstruments } = sheet
  return patternDb !== null && patternInstruments >= PATTERN_LEAST_INSTRUMENTS ? patternDb : null
}

const latest = new WeakMap<RunState, { levelChanges: number; evaluated: EvaluatedRun }>()

/**
 * Every level, balance, range, step and mean level from the plucks that are accepted so far. Kept until the levels
 * change: the simulation takes milliseconds and a screen asks often.
 */
export function evaluateRun(state: RunState): EvaluatedRun {
  const known = latest.get(state)
  if (known?.levelChanges === state.levelChanges) return known.evaluated
  const evaluated = workOut(state)
  latest.set(state, { levelChanges: state.levelChanges, evaluated })
  return evaluated
}

function workOut(state: RunState): EvaluatedRun {
  const { setup } = state
  const pattern = patternInForce(setup.sheet)
  const uPattern = pattern === null ? 0 : setup.sheet.patternUDb
  const scatter = scatterOf(state)
  const strings = state.strings.map((tally) => evaluateLevel(state, tally, scatter))
  const reference = referenceOf(strings.map(({ level }) => ({ levelDb: level.value, atMost: level.atMost })))
  const independent = strings.map((string) => string.independent)
  strings.forEach((string, i) => {
    const value = balanceDb(string.level.value, reference.referenceDb, pattern?.[i] ?? 0)
    string.balance = {
      value,
      atMost: value !== null && string.level.atMost,
      n: string.level.n,
      parts: value === null ? [] : balanceUncertainty(i, independent, reference.members, uPattern),
    }
  })
  return {
    strings,
    reference,
    meanLevel: evaluateMeanLevel(state, strings, reference),
    ...evaluateRangeAndStep(strings, pattern, uPattern),
  }
}

/** Standard deviation of one pluck: from the bench's study, else pooled over the strings of the run. */
function scatterOf(state: RunState): PooledSd | null {
  const { studySDb } = state.setup
  if (studySDb !== null) return { sd: studySDb, dof: null }
  return pooledSd(state.strings.map((tally) => tally.accepted.map((pluck) => pluck.levelDb!)))
}

function evaluateLevel(state: RunState, tally: StringTally, scatter: PooledSd | null): EvaluatedString {
  const plucks = tally.accepted
  const levels = plucks.map((pluck) => pluck.levelDb!)
  const independent = independentParts(state, tally, scatter)
  const level = levels.length === 0 ? censoredLevel(state, tally) : meanLevel(state, levels, independent)
  return {
    tally,
    level,
    sDb: sampleSd(levels),
    balance: NOTHING,
    separation: evaluateSeparation(state, tally),
    rawDb: meanOf(plucks.map((pluck) => pluck.rawDb!)),
    rawADb: plucks.some((pluck) => pluck.rawADb === null)
      ? null
      : meanOf(plucks.map((pluck) => pluck.rawADb!)),
    independent,
  }
}

/** 'At most floor + 6 dB' for a string that is silent; no level for one that is not finished. */
function censoredLevel(state: RunState, tally: StringTally): Evaluated {
  const bound = state.floorDb[channelOf(state, tally.stringNo)]! + CENSOR_DB
  if (tally.state !== 'silent' || !Number.isFinite(bound)) return NOTHING
  return { value: bound, atMost: true, n: 0, parts: [] }
}

function meanLevel(
  state: RunState,
  levels: readonly number[],
  independent: IndependentParts | null,
): Evaluated {
  const parts: UncertaintyPart[] = []
  if (independent) parts.push(independent.scatter, independent.own, { u: sharedU(state), dof: null })
  return { value: meanOf(levels), atMost: false, n: levels.length, parts }
}

/**
 * What all levels of the run share: the shared calibration, and on a one-channel bench the channel's own as well,
 * since every string is read there.
 */
function sharedU(state: RunState): number {
  const { uCalOwnDb, uCalSharedDb } = state.setup
  return state.plan.channels === 1 ? Math.hypot(uCalOwnDb, uCalSharedDb) : uCalSharedDb
}

function independentParts(
  state: RunState,
  tally: StringTally,
  scatter: PooledSd | null,
): EvaluatedString['independent'] {
  const n = tally.accepted.length
  if (n === 0 || scatter === null) return null
  const { setup, plan } = state
  const decays = tally.accepted.flatMap((pluck) => (pluck.decayDbPerS === null ? [] : [pluck.decayDbPerS]))
  const parts = levelUncertainty({
    scatter,
    n,
    uCalOwnDb: plan.channels === 1 ? 0 : setup.uCalOwnDb,
    uCalSharedDb: setup.uCalSharedDb,
    frameMs: setup.frameMs,
    decayDbPerS: meanOf(decays) ?? DECAY_FALLBACK_DB_PER_S,
  })
  return { scatter: parts.scatter, own: parts.own, start: parts.start }
}

function evaluateSeparation(state: RunState, tally: StringTally): Evaluated {
  const values = tally.accepted.flatMap((pluck) => (pluck.separationDb === null ? [] : [pluck.separationDb]))
  const value = meanOf(values)
  if (value === null) return NOTHING
  const sd = sampleSd(values)
  const parts: UncertaintyPart[] = []
  if (sd !== null) {
    parts.push({ u: sd / Math.sqrt(values.length), dof: values.length - 1 })
    // own and other channel
    parts.push({ u: Math.SQRT2 * state.setup.uCalOwnDb, dof: null })
  }
  return { value, atMost: false, n: values.length, parts }
}

/** The reference against the model's reference level: its independent parts shrink by m, what is shared stays whole. */
function evaluateMeanLevel(
  state: RunState,
  strings: readonly EvaluatedString[],
  reference: Reference,
): Evaluated {
  if (reference.referenceDb === null) return NOTHING
  const members = strings.filter((_, i) => reference.members[i])
  const known = members.flatMap((string) => (string.independent ? [string.independent] : []))
  const m = members.length
  const scatter = known[0]?.scatter
  return {
    value: reference.referenceDb - state.setup.sheet.referenceLevelDb,
    atMost: false,
    n: members.reduce((least, string) => Math.min(least, string.level.n), Infinity),
    parts:
      scatter === undefined
        ? []
        : [
            { u: combinedU(known.map((part) => part.scatter)) / m, dof: scatter.dof },
            { u: combinedU(known.map((part) => part.own)) / m, dof: null },
            { u: sharedU(state), dof: null },
          ],
  }
}

/**
 * Range and step need no reference: they are differences of level minus pattern. With a censored string neither is
 * known, but the range is at least what the bound leaves.
 */
function evaluateRangeAndStep(
  strings: readonly EvaluatedString[],
  pattern: readonly number[] | null,
  uPattern: number,
): Pick<EvaluatedRun, 'range' | 'step' | 'simulated' | 'leastRangeDb' | 'leastStepDb'> {
  const deviations = strings.map(({ level }, i) => balanceDb(level.value, 0, pattern?.[i] ?? 0))
  const censored = strings.map(({ level }) => level.atMost)
  const exact = deviations.map((deviation, i) => (censored[i] ? null : deviation))
  const n = Math.min(...strings.map(({ level }) => level.n))
  const evaluated = (value: number | null): Evaluated => ({ ...NOTHING, value, n: value === null ? 0 : n })
  const independent = strings.map((string) => string.independent)
  let simulated: ReturnType<EvaluatedRun['simulated']> | undefined
  return {
    range: evaluated(rangeDb(exact)),
    step: evaluated(stepDb(exact)),
    simulated: () => (simulated ??= rangeStepUncertainty(exact, independent, uPattern)),
    ...leastOf(deviations, censored),
  }
}

function leastOf(
  deviations: readonly (number | null)[],
  censored: readonly boolean[],
): { leastRangeDb: number | null; leastStepDb: number | null } {
  if (!censored.includes(true)) return { leastRangeDb: null, leastStepDb: null }
  const known = deviations.filter((deviation, i) => deviation !== null && !censored[i]) as number[]
  const bounds = deviations.filter((deviation, i) => deviation !== null && censored[i]) as number[]
  if (known.length === 0) return { leastRangeDb: null, leastStepDb: null }
  const lowest = Math.min(...known, ...bounds)
  let step = 0
  for (let i = 1; i < deviations.length; i++) {
    const [a, b] = [deviations[i - 1]!, deviations[i]!]
    if (a === null || b === null || (censored[i - 1] && censored[i])) continue
    // a bound says only how far down at most: the step is known as far as the other one stands above it
    const difference = censored[i] ? a - b : censored[i - 1] ? b - a : Math.abs(a - b)
    step = Math.max(step, difference)
  }
  return { leastRangeDb: Math.max(...known) - lowest, leastStepDb: step }
}

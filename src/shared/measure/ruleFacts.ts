import { STRING_NOS } from '../contract/quantities.ts'
import type { RuleId } from '../contract/rules.ts'
import { capabilitiesCover } from './capabilitiesCover.ts'
import { LEAST_PLUCKS } from './constants.ts'
import type { Evaluated, EvaluatedRun, EvaluatedString } from './evaluateRun.ts'
import { NO_FACT, type RuleFact } from './judgeRule.ts'
import { allNo, allYes, meanOfAverage } from './jackWatch.ts'
import type { NoiseReadings } from './noiseReadings.ts'
import { isFinished, type RunState } from './state.ts'
import { isTipWatched } from './wigglePhase.ts'

const NOT_REACHED: RuleFact = { ...NO_FACT, notTested: 'notReached' }
const NOT_MEASURABLE: RuleFact = { ...NO_FACT, notTested: 'notMeasurable' }

/** What one rule of a run is judged on; stringNo null for a rule of the whole run. */
export function ruleFact(
  state: RunState,
  evaluated: EvaluatedRun,
  noise: NoiseReadings,
  rule: RuleId,
  stringNo: number | null,
): RuleFact {
  if (!capabilitiesCover(rule, state.setup.capabilities)) return enteredFact(state, rule, stringNo)
  const string = stringNo === null ? null : evaluated.strings[stringNo - 1]!
  switch (rule) {
    case 'speaks':
      return speaksFact(string!)
    case 'level':
      return stringFact(state, string!, string!.level)
    case 'balance':
      return balanceFact(state, evaluated, string!)
    case 'channelSeparation':
      return separationFact(state, string!)
    case 'range':
      return spreadFact(state, evaluated, 'range')
    case 'step':
      return spreadFact(state, evaluated, 'step')
    case 'meanLevel':
      return meanLevelFact(state, evaluated)
    case 'noiseFlat':
      return readingFact(noise.flat)
    case 'noiseA':
      return readingFact(noise.a)
    case 'hum':
      return readingFact(noise.hum)
    case 'snFlat':
      return signalToNoiseFact(state, evaluated, noise.snFlat)
    case 'snA':
      return signalToNoiseFact(state, evaluated, noise.snA)
    default:
      return jackFact(state, rule)
  }
}

function enteredFact(state: RunState, rule: RuleId, stringNo: number | null): RuleFact {
  const entry = state.entered.find((entered) => entered.rule === rule && entered.stringNo === stringNo)
  if (!entry) return NOT_MEASURABLE
  return { ...NO_FACT, value: entry.value, n: 1, parts: [{ u: entry.u, dof: null }], byHand: true }
}

function readingFact(reading: Evaluated): RuleFact {
  return reading.value === null ? NOT_REACHED : { ...NO_FACT, ...reading }
}

function speaksFact({ tally }: EvaluatedString): RuleFact {
  const n = tally.accepted.length
  if (n > 0) return { ...NO_FACT, value: 1, n }
  if (tally.state === 'silent') return { ...NO_FACT, value: 0, outside: 'noSignal', n: tally.noSignalCount }
  if (tally.state === 'triesUsed') return { ...NO_FACT, invalid: 'tooFewPlucks', n: tally.tries }
  return NOT_REACHED
}

/** Why a string's reading is not sound: too few plucks, or too much scatter with all that may be had. */
function unsoundness(state: RunState, string: EvaluatedString): 'tooFewPlucks' | 'scatterTooLarge' | null {
  const { tally, sDb } = string
  if (tally.state === 'silent') return null
  if (tally.accepted.length < LEAST_PLUCKS) return 'tooFewPlucks'
  return sDb !== null && sDb <= state.setup.sheet.plucks.largestSDb ? null : 'scatterTooLarge'
}

/** The string is finished, or the run is and left it with some plucks. */
function isReached(state: RunState, { tally }: EvaluatedString): boolean {
  return tally.state !== 'todo' || (isFinished(state) && tally.accepted.length > 0)
}

function stringFact(state: RunState, string: EvaluatedString, reading: Evaluated): RuleFact {
  if (!isReached(state, string)) return { ...NOT_REACHED, ...reading }
  return { ...NO_FACT, ...reading, invalid: unsoundness(state, string) }
}

function balanceFact(state: RunState, evaluated: EvaluatedRun, string: EvaluatedString): RuleFact {
  const fact = stringFact(state, string, string.balance)
  if (fact.notTested !== null || fact.invalid !== null) return fact
  return evaluated.reference.referenceDb === null ? { ...fact, invalid: 'noReference' } : fact
}

function separationFact(state: RunState, string: EvaluatedString): RuleFact {
  if (string.tally.state === 'silent') return { ...NO_FACT, invalid: 'noSignal' }
  const fact = stringFact(state, string, string.separation)
  return fact.notTested === null && string.separation.value === null && fact.invalid === null
    ? NOT_REACHED
    : fact
}

/** Unsound strings make every reading of all strings unsound; one that was never reached leaves it untested. */
function allStringsFact(
  state: RunState,
  strings: readonly EvaluatedString[],
): { notTested: 'notReached' | null; invalid: 'tooFewPlucks' | 'scatterTooLarge' | null } {
  const notTested = strings.every((string) => isReached(state, string)) ? null : ('notReached' as const)
  const invalid = strings.map((string) => unsoundness(state, string)).find((why) => why !== null) ?? null
  return { notTested, invalid }
}

function spreadFact(state: RunState, evaluated: EvaluatedRun, which: 'range' | 'step'): RuleFact {
  const reading = evaluated[which]
  const sound = allStringsFact(state, evaluated.strings)
  const atLeast = which === 'range' ? evaluated.leastRangeDb : evaluated.leastStepDb
  const allSilent = evaluated.strings.every(({ level }) => level.atMost)
  return {
    ...NO_FACT,
    ...reading,
    ...sound,
    invalid: sound.invalid ?? (allSilent ? 'noReference' : null),
    simulated: () => evaluated.simulated()?.[which] ?? null,
    atLeast: reading.value === null ? atLeast : null,
  }
}

function meanLevelFact(state: RunState, evaluated: EvaluatedRun): RuleFact {
  const { notTested } = allStringsFact(state, evaluated.strings)
  const members = evaluated.strings.filter((_, i) => evaluated.reference.members[i])
  const { invalid } = allStringsFact(state, members)
  return {
    ...NO_FACT,
    ...evaluated.meanLevel,
    notTested,
    invalid: invalid ?? (evaluated.reference.referenceDb === null ? 'noReference' : null),
  }
}

function signalToNoiseFact(state: RunState, evaluated: EvaluatedRun, reading: Evaluated): RuleFact {
  const sound = allStringsFact(state, evaluated.strings)
  if (sound.notTested !== null || sound.invalid !== null) return { ...NO_FACT, ...reading, ...sound }
  if (reading.value !== null) return { ...NO_FACT, ...reading }
  // A-weighted, a silent string leaves no bound: its floor is known broadband only
  const silent = evaluated.strings.some(({ level }) => level.atMost)
  return silent ? { ...NO_FACT, invalid: 'noSignal' } : NOT_REACHED
}

type StringRule = 'speaks' | 'level' | 'balance' | 'range' | 'step' | 'meanLevel' | 'channelSeparation'
type NoiseRule = 'noiseFlat' | 'noiseA' | 'hum' | 'snFlat' | 'snA'

/** Exhaustive: a rule that is new to the contract does not compile until it has its fact. */
function jackFact(state: RunState, rule: Exclude<RuleId, StringRule | NoiseRule>): RuleFact {
  const { unplugged, rest, wiggle, contact } = state.jack
  const { jack } = state
  const unpluggedContradicts = unplugged.tipClosed.yes > 0
  const restContradicts = rest.plugOut > 0
  switch (rule) {
    case 'switchOpen':
      return yesNoFact(
        jack.unpluggedDone ? allNo(unplugged.ringClosed) : null,
        unplugged.frames,
        unpluggedContradicts,
      )
    case 'currentUnplugged':
      return valueFact(
        jack.unpluggedDone ? meanOfAverage(unplugged.currentUa) : null,
        unplugged.currentUa.frames,
        unpluggedContradicts,
      )
    case 'switchClosed':
      return yesNoFact(jack.restDone ? allYes(rest.ringClosed) : null, rest.frames, restContradicts)
    case 'currentPlugged':
      return valueFact(
        scaled(jack.restDone ? meanOfAverage(rest.currentUa) : null, 1000),
        rest.currentUa.frames,
        restContradicts,
      )
    case 'battery':
      return valueFact(
        scaled(jack.restDone ? meanOfAverage(rest.batteryMv) : null, 1000),
        rest.batteryMv.frames,
        restContradicts,
      )
    case 'tipContinuity': {
      const n = rest.frames + wiggle.tipClosed.yes + wiggle.tipClosed.no
      return wiggleFact(state, yesNoFact(tipSteady(state), n, restContradicts))
    }
    case 'disturbanceCount':
      return wiggleFact(state, valueFact(jack.wiggleDone ? wiggle.count : null, 1, false))
    case 'disturbanceLongest': {
      const longestMs = jack.wiggleDone ? wiggle.longestTenthMs / 10 : null
      return wiggleFact(state, valueFact(longestMs, wiggle.count, false))
    }
    case 'contactTip':
      return valueFact(scaled(contact.tip, 1_000_000), 1, false)
    case 'contactRing':
      return valueFact(scaled(contact.ring, 1_000_000), 1, false)
    case 'contactSleeve':
      return valueFact(scaled(contact.sleeve, 1_000_000), 1, false)
    case 'insulation':
      return valueFact(scaled(jack.insulationKiloOhm, 1000), 1, false)
  }
}

/** What is read of the wiggle is nothing when the plug was left out, and never within when the tip was not watched. */
function wiggleFact(state: RunState, fact: RuleFact): RuleFact {
  if (fact.notTested !== null) return fact
  if (state.jack.wiggle.endedUnplugged) return { ...fact, invalid: 'disagreesWithState' }
  return isTipWatched(state) ? fact : { ...fact, notWithin: 'disagreesWithState' }
}

/** The tip was closed in every frame at rest and in the wiggle; null until both are over or when it is not measured. */
export function tipSteady(state: RunState): boolean | null {
  const { jack, plan } = state
  const restMissing = plan.phases.includes('jackRest') && !jack.restDone
  const wiggleMissing = plan.phases.includes('wiggle') && !jack.wiggleDone
  if (restMissing || wiggleMissing) return null
  const yes = jack.rest.tipClosed.yes + jack.wiggle.tipClosed.yes
  const no = jack.rest.tipClosed.no + jack.wiggle.tipClosed.no
  return allYes({ yes, no })
}

function scaled(value: number | null, divisor: number): number | null {
  return value === null ? null : value / divisor
}

function yesNoFact(said: boolean | null, n: number, contradicts: boolean): RuleFact {
  return valueFact(said === null ? null : said ? 1 : 0, n, contradicts)
}

function valueFact(value: number | null, n: number, contradicts: boolean): RuleFact {
  if (value === null) return NOT_REACHED
  return { ...NO_FACT, value, n, invalid: contradicts ? 'disagreesWithState' : null }
}

/** Strings that a rule has results for. */
export function stringsOfRule(perElement: boolean): readonly (number | null)[] {
  return perElement ? STRING_NOS : [null]
}

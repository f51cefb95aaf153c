import type { Reading, Unit } from '../contract/quantities.ts'
import { RULES } from '../contract/rules.ts'
import type { JackState, MeasuredRun, Pluck, PromptKey, StringResult } from '../contract/measured.ts'
import { capabilitiesCover } from './capabilitiesCover.ts'
import { FRESH_STRINGS_MINUTES, NOT_YET_QUIET_MS } from './constants.ts'
import {
  evaluateRun,
  patternInForce,
  type Evaluated,
  type EvaluatedRun,
  type EvaluatedString,
} from './evaluateRun.ts'
import { expandedUncertainty } from './expandedUncertainty.ts'
import { allNo, allYes, meanOfAverage } from './jackWatch.ts'
import { judgeRun } from './judgeRun.ts'
import { readNoise, type NoiseReadings } from './noiseReadings.ts'
import { elapsedMs } from './phaseTime.ts'
import { progressOf } from './progressOf.ts'
import type { SimulatedSpread } from './rangeStepUncertainty.ts'
import { tipSteady } from './ruleFacts.ts'
import { sheetRuleOf } from './runPlan.ts'
import { askedString, isFinished, type RunState } from './state.ts'
import type { MeasuredPluck } from './stringTally.ts'
import { combinedU, welchSatterthwaite } from './welchSatterthwaite.ts'

/** The whole run as the contract shows it. */
export function buildView(state: RunState): MeasuredRun {
  const evaluated = evaluateRun(state)
  const noise = readNoise(state, evaluated)
  const { prompt, stringNo } = promptOf(state)
  return {
    frames: state.frames,
    phase: state.phase,
    prompt,
    promptStringNo: stringNo,
    phases: [...state.plan.phases],
    progress: progressOf(state),
    warnings: warningsOf(state),
    strings: evaluated.strings.map((string) => stringResult(state, evaluated, string)),
    plucks: state.plucks.map(contractPluck),
    referenceDb: evaluated.reference.referenceDb,
    provisional: !isFinished(state) && askedString(state) !== null,
    range: simulatedReading(evaluated.range, evaluated.simulated()?.range ?? null),
    step: simulatedReading(evaluated.step, evaluated.simulated()?.step ?? null),
    meanLevel: readingOf(evaluated.meanLevel, 'dB'),
    noise: noiseOf(state, noise),
    snFlat: readingOf(noise.snFlat, 'dB'),
    snA: readingOf(noise.snA, 'dB'),
    jack: jackOf(state),
    supply: supplyOf(state),
    entered: state.entered.map((entry) => ({ ...entry })),
    results: judgeRun(state, evaluated, noise),
    verdict: state.verdict,
  }
}

/** A reading as it is shown: u, U two-sided, degrees of freedom; what is not finite is no reading. */
function readingOf({ value, atMost, n, parts }: Evaluated, unit: Unit): Reading {
  if (value === null || !Number.isFinite(value)) {
    return { value: null, atMost: false, unit, n: 0, u: null, expandedU: null, dof: null }
  }
  const u = parts.length === 0 ? NaN : combinedU(parts)
  if (!Number.isFinite(u)) return { value, atMost, unit, n, u: null, expandedU: null, dof: null }
  const dof = welchSatterthwaite(parts)
  return { value, atMost, unit, n, u, expandedU: expandedUncertainty(u, dof, 2), dof }
}

function simulatedReading(evaluated: Evaluated, spread: SimulatedSpread | null): Reading {
  const reading = readingOf(evaluated, 'dB')
  if (reading.value === null || spread === null) return reading
  return { ...reading, u: spread.u, expandedU: spread.expandedTwoSided }
}

function stringResult(state: RunState, evaluated: EvaluatedRun, string: EvaluatedString): StringResult {
  const { tally } = string
  return {
    stringNo: tally.stringNo,
    name: state.setup.model.tuning.find((pitch) => pitch.stringNo === tally.stringNo)?.name ?? '',
    state: tally.state,
    accepted: tally.accepted.length,
    wanted: tally.wanted,
    tries: tally.tries,
    triesMax: state.plan.triesMax,
    noSignalCount: tally.noSignalCount,
    repeated: tally.repeated,
    repeatReason: tally.repeatReason,
    level: readingOf(string.level, 'dBV'),
    sDb: string.sDb,
    balance: readingOf(string.balance, 'dB'),
    separation: readingOf(string.separation, 'dB'),
    inReference: evaluated.reference.members[tally.stringNo - 1]!,
  }
}

function contractPluck(pluck: MeasuredPluck): Pluck {
  const { no, onsetFrame, stringNo, toldBy, milliHz, levelDb, rawDb, atMost, separationDb, dropped } = pluck
  return { no, onsetFrame, stringNo, toldBy, milliHz, levelDb, rawDb, atMost, separationDb, dropped }
}

function noiseOf(state: RunState, noise: NoiseReadings): MeasuredRun['noise'] {
  return {
    flat: readingOf(noise.flat, 'dBV'),
    a: readingOf(noise.a, 'dBV'),
    hum: readingOf(noise.hum, 'dBV'),
    mainsHz: state.setup.mainsHz,
    at: noise.at,
    fromFrame: state.noise?.fromFrame ?? null,
    toFrame: state.noise?.toFrame ?? null,
  }
}

function jackOf(state: RunState): JackState {
  const { jack, setup } = state
  const inWiggle = state.phase === 'wiggle'
  const isWiggleShown = inWiggle || (jack.wiggleDone && !jack.wiggle.endedUnplugged)
  const ohm = (microOhm: number | null) => (microOhm === null ? null : microOhm / 1_000_000)
  return {
    unpluggedOpen: jack.unpluggedDone ? allNo(jack.unplugged.ringClosed) : null,
    pluggedClosed: jack.restDone ? allYes(jack.rest.ringClosed) : null,
    tipSteady: jack.wiggle.endedUnplugged ? null : tipSteady(state),
    disturbanceCount: isWiggleShown ? jack.wiggle.count : null,
    disturbanceLongestMs: isWiggleShown ? jack.wiggle.longestTenthMs / 10 : null,
    contactTipOhm: ohm(jack.contact.tip),
    contactRingOhm: ohm(jack.contact.ring),
    contactSleeveOhm: ohm(jack.contact.sleeve),
    insulationMohm: jack.insulationKiloOhm === null ? null : jack.insulationKiloOhm / 1000,
    wiggleProgress: jack.wiggleDone ? 1 : inWiggle ? Math.min(1, elapsedMs(state) / setup.sheet.wiggleMs) : 0,
    wiggleStartedBy: jack.wiggleStartedBy,
  }
}

function supplyOf({ jack }: RunState): MeasuredRun['supply'] {
  const milli = (value: number | null) => (value === null ? null : value / 1000)
  return {
    pluggedMa: jack.restDone ? milli(meanOfAverage(jack.rest.currentUa)) : null,
    unpluggedUa: jack.unpluggedDone ? meanOfAverage(jack.unplugged.currentUa) : null,
    batteryV: jack.restDone ? milli(meanOfAverage(jack.rest.batteryMv)) : null,
  }
}

function warningsOf(state: RunState): MeasuredRun['warnings'] {
  const { setup } = state
  const { strungMinutes } = setup.conditions
  const { batteryV } = supplyOf(state)
  const leastV = sheetRuleOf(setup, 'battery')?.low ?? RULES.battery.low!
  const judgesBalance = setup.sheet.rules.some(({ rule }) => ['balance', 'range', 'step'].includes(rule))
  const notMeasurable = setup.sheet.rules.some(
    ({ rule, required }) =>
      required &&
      !capabilitiesCover(rule, setup.capabilities) &&
      !state.entered.some((entry) => entry.rule === rule),
  )
  const warnings: MeasuredRun['warnings'] = []
  if (!setup.conditions.controlsSet) warnings.push('controlsNotSet')
  if (strungMinutes !== null && strungMinutes < FRESH_STRINGS_MINUTES) warnings.push('stringsFresh')
  if (judgesBalance && patternInForce(setup.sheet) === null) warnings.push('patternNotSet')
  if (!setup.verified) warnings.push('benchNotVerified')
  if (batteryV !== null && batteryV < leastV) warnings.push('batteryLow')
  if (state.phase === 'noise' && elapsedMs(state) >= NOT_YET_QUIET_MS) warnings.push('notYetQuiet')
  if (notMeasurable) warnings.push('ruleNotMeasurable')
  return warnings
}

/** What the one sentence on the screen asks for now, and for which string. Constant work, unlike the whole view. */
export function promptOf(state: RunState): { prompt: PromptKey; stringNo: number | null } {
  switch (state.phase) {
    case 'unplugged':
      return { prompt: state.jack.unpluggedDone ? 'plugIn' : 'leaveUnplugged', stringNo: null }
    case 'settle':
      return {
        prompt: state.settle.frames === 0 && state.plugged === false ? 'plugIn' : 'waitSettle',
        stringNo: null,
      }
    case 'jackRest':
      return { prompt: state.plugged === false ? 'plugIn' : 'holdStill', stringNo: null }
    case 'noise':
      return { prompt: state.stretch.quiet > 0 ? 'keepMuted' : 'muteAll', stringNo: null }
    case 'strings':
      return stringsPrompt(state)
    case 'wiggleReady':
      return { prompt: state.plugged === false ? 'plugIn' : 'getReadyToWiggle', stringNo: null }
    case 'wiggle':
      return { prompt: state.jack.wiggle.waitsForPlug ? 'plugIn' : 'wiggleNow', stringNo: null }
    case 'entry':
      return { prompt: 'enterValues', stringNo: null }
    case 'done':
      return { prompt: 'finished', stringNo: null }
    case 'stopped':
      return { prompt: 'stopped', stringNo: null }
  }
}

/** Again after a pluck of this string, or of none, was dropped; more when it has what was wanted at first. */
function stringsPrompt(state: RunState): { prompt: PromptKey; stringNo: number | null } {
  const asked = askedString(state)
  if (asked === null) return { prompt: 'dampThenPluck', stringNo: null }
  const { stringNo } = asked
  const last = state.plucks.at(-1)
  const lastMissed =
    last !== undefined &&
    last.dropped !== null &&
    last.dropped !== 'setAside' &&
    (last.stringNo === null || last.stringNo === stringNo)
  if (lastMissed) return { prompt: 'pluckAgain', stringNo }
  return { prompt: asked.wanted > state.plan.n ? 'pluckMore' : 'dampThenPluck', stringNo }
}

import type { MeasuredRun, RuleResult } from '../contract/measured.ts'
import type { RuleId } from '../contract/rules.ts'
import type { RunSetup } from '../contract/runs.ts'

/** Signatures that point at a cause without opening the instrument; words for each stand in a table of the client. */
export type CauseKey =
  | 'elementOpenParallel'
  | 'elementOrChannelDead'
  | 'poorSeating'
  | 'stripEnd'
  | 'outerStringsWeak'
  | 'middleStringsWeak'
  | 'slope'
  | 'inputLoading'
  | 'controlsNotSet'
  | 'noPower'
  | 'stripShorted'
  | 'ringNotClosed'
  | 'batteryLow'
  | 'hum'
  | 'hiss'
  | 'dropOuts'
  | 'tipOpen'
  | 'poweredUnplugged'
  | 'currentHigh'
  | 'currentZero'

export interface LikelyCause {
  key: CauseKey
  /** strings that show it, treble E first; empty: the whole instrument */
  stringNos: number[]
}

/** A string this far below the reference counts as dead, dB (common practice, no source). */
const DEAD_DB = -15
/** Sum of five of six equal elements against six, dB: 20 lg(6/5) = 1.58; taken as seen from 0.8 to 2.6. */
const FIVE_UP_DB = { from: 0.8, to: 2.6 }
/** A group counts as weak when it lies this far below the others, dB (common practice, no source). */
const GROUP_WEAK_DB = -3
/** A slope across the strings: at least this much a string, dB, and this share of the spread explained. */
const SLOPE = { dbPerString: 0.8, rSquared: 0.8 }
/** All strings together this far below the model's reference level, dB, count as all low. */
const ALL_LOW_DB = -5
/** Below this supply current, mA, a preamp has no power. */
const NO_CURRENT_MA = 0.05

const MOST = 3

/**
 * Likeliest causes of what a run found outside its limits, at most three, the most telling first. Rows of the trade's
 * fault table that have a clear signature in the readings; the limits of each signature are common practice without a
 * published source, so a cause is only ever worded as likely and comes with a check to do first.
 * Takes what was measured and the run's set-up; gives an empty list when nothing was outside, or nothing fits.
 * Readings that are missing or not finite fit no signature.
 */
export function likelyCauses(measured: MeasuredRun, setup: Pick<RunSetup, 'model'>): LikelyCause[] {
  const outside = measured.results.filter((result) => result.result === 'outside')
  if (outside.length === 0) return []
  const fromLevels = levelCauses(measured, setup, outside)
  // No power names the battery itself.
  const isPowerTold = fromLevels.some(({ key }) => key === 'noPower')
  const fromRest = electricalCauses(measured, outside).filter(
    ({ key }) => !(isPowerTold && key === 'batteryLow'),
  )
  return [...fromLevels, ...fromRest].slice(0, MOST)
}

function levelCauses(
  measured: MeasuredRun,
  setup: Pick<RunSetup, 'model'>,
  outside: RuleResult[],
): LikelyCause[] {
  const isDead = (s: MeasuredRun['strings'][number]) =>
    s.state === 'silent' || (isFiniteNumber(s.balance.value) && s.balance.value < DEAD_DB)
  const dead = measured.strings.filter(isDead).map((s) => s.stringNo)
  const meanLevel = measured.meanLevel.value
  if (dead.length === 6) return allSilent(measured)
  if (dead.length === 1) {
    const roseBy = isFiniteNumber(meanLevel) && meanLevel >= FIVE_UP_DB.from && meanLevel <= FIVE_UP_DB.to
    const key = setup.model.circuit === 'parallel' && roseBy ? 'elementOpenParallel' : 'elementOrChannelDead'
    return [{ key, stringNos: dead }]
  }
  if (isFiniteNumber(meanLevel) && meanLevel <= ALL_LOW_DB && has(outside, 'meanLevel')) {
    return [{ key: isBassThin(measured) ? 'inputLoading' : 'controlsNotSet', stringNos: [] }]
  }
  const balances = measured.strings.map((s) => s.balance.value)
  if (!has(outside, 'balance', 'range', 'step') || !balances.every(isFiniteNumber)) return []
  return shapeCauses(balances, outside)
}

/** What six balances look like, string 1 first. */
function shapeCauses(balances: number[], outside: RuleResult[]): LikelyCause[] {
  const low = outside
    .filter((r) => r.rule === 'balance' && r.stringNo !== null && (r.value ?? 0) < 0)
    .map((r) => r.stringNo!)
  const outerLess = groupLess(balances, [1, 6])
  const middleLess = groupLess(balances, [3, 4])
  const { slope, rSquared } = lineOver(balances)
  if (Math.abs(slope) >= SLOPE.dbPerString && rSquared >= SLOPE.rSquared) {
    const weakEnd = slope > 0 ? [1, 2] : [5, 6]
    return [{ key: 'slope', stringNos: weakEnd }]
  }
  if (outerLess) return [{ key: 'outerStringsWeak', stringNos: [1, 6] }]
  if (middleLess) return [{ key: 'middleStringsWeak', stringNos: [3, 4] }]
  if (low.length !== 1) return []
  const atEnd = low[0] === 1 || low[0] === 6
  return [
    { key: 'poorSeating', stringNos: low },
    ...(atEnd ? [{ key: 'stripEnd' as const, stringNos: low }] : []),
  ]
}

function allSilent({ supply, jack }: MeasuredRun): LikelyCause[] {
  const noCurrent = supply.pluggedMa !== null && supply.pluggedMa < NO_CURRENT_MA
  if (jack.pluggedClosed === false) return [{ key: 'ringNotClosed', stringNos: [] }]
  if (noCurrent) return [{ key: 'noPower', stringNos: [] }]
  if (jack.tipSteady === false) return [{ key: 'tipOpen', stringNos: [] }]
  return [{ key: 'stripShorted', stringNos: [] }]
}

function electricalCauses({ supply, strings, jack }: MeasuredRun, outside: RuleResult[]): LikelyCause[] {
  const causes: CauseKey[] = []
  const allSilentToo = strings.every((s) => s.state === 'silent')
  const currentHighSide = outside.some(
    (r) => r.rule === 'currentPlugged' && r.value !== null && r.high !== null && r.value > r.high,
  )
  const noCurrent = supply.pluggedMa !== null && supply.pluggedMa < NO_CURRENT_MA
  if (has(outside, 'battery')) causes.push('batteryLow')
  if (has(outside, 'switchClosed') && !allSilentToo) causes.push('ringNotClosed')
  if (currentHighSide) causes.push('currentHigh')
  if (noCurrent && !allSilentToo && jack.pluggedClosed !== false && has(outside, 'currentPlugged')) {
    causes.push('currentZero')
  }
  if (has(outside, 'hum')) causes.push('hum')
  else if (has(outside, 'noiseA')) causes.push('hiss')
  if (has(outside, 'disturbanceCount', 'disturbanceLongest')) causes.push('dropOuts')
  else if (has(outside, 'tipContinuity') && !allSilentToo) causes.push('tipOpen')
  if (has(outside, 'switchOpen', 'currentUnplugged')) causes.push('poweredUnplugged')
  return causes.map((key) => ({ key, stringNos: [] }))
}

function isFiniteNumber(value: number | null | undefined): value is number {
  return typeof value === 'number' && Number.isFinite(value)
}

function has(outside: RuleResult[], ...rules: RuleId[]): boolean {
  return outside.some((result) => rules.includes(result.rule))
}

function meanOf(values: number[]): number {
  return values.reduce((sum, value) => sum + value, 0) / values.length
}

/** Every string of the group lies clearly below every other string's mean. */
function groupLess(balances: number[], group: number[]): boolean {
  const others = meanOf(balances.filter((_, i) => !group.includes(i + 1)))
  return group.every((stringNo) => balances[stringNo - 1]! - others <= GROUP_WEAK_DB)
}

function isBassThin({ strings }: MeasuredRun): boolean {
  const value = (stringNo: number) => strings[stringNo - 1]!.balance.value
  const bass = [value(6), value(5)]
  const treble = [value(1), value(2)]
  if (!bass.every(isFiniteNumber) || !treble.every(isFiniteNumber)) return false
  return meanOf(bass) - meanOf(treble) <= GROUP_WEAK_DB
}

/** Least-squares line over the strings: dB a string towards the bass, and the share of the spread that it explains. */
function lineOver(balances: number[]): { slope: number; rSquared: number } {
  const center = meanOf(balances)
  const offsets = balances.map((_, i) => i - (balances.length - 1) / 2)
  const along = balances.reduce((sum, value, i) => sum + offsets[i]! * (value - center), 0)
  const lengths = offsets.reduce((sum, offset) => sum + offset * offset, 0)
  const spread = balances.reduce((sum, value) => sum + (value - center) ** 2, 0)
  const slope = along / lengths
  return { slope, rSquared: spread === 0 ? 0 : (slope * slope * lengths) / spread }
}

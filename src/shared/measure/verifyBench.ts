import { NOT_MEASURED_MDB, SILENCE_MDB } from '../contract/quantities.ts'
import type { BenchVerify, ChannelKind } from '../contract/frames.ts'
import { RULES, type Capability } from '../contract/rules.ts'
import { meanOf } from './meanOf.ts'

/** dB that the quiet source must lie below the usual noise limits (trade practice, from memory). */
const QUIET_BELOW_LIMIT_DB = 10

/** How far a bench may read off its check standard. Trade practice and from memory; no standard names them. */
export const VERIFY_LIMITS = {
  /** dB, electrical, at each level of each channel */
  toneDb: 0.3,
  /** ohm, four-wire */
  resistanceOhm: 0.01,
  /** dBV that the quiet source may read at most */
  quietFlatDb: RULES.noiseFlat.high! - QUIET_BELOW_LIMIT_DB,
  quietADb: RULES.noiseA.high! - QUIET_BELOW_LIMIT_DB,
  /** ohm from which a contact that is not reported as open counts as open; near the most that travels */
  openOhm: 1000,
  /** share of the known current, and microampere, that it may be off together */
  currentShare: 0.03,
  currentUa: 50,
} as const

/** Floor of a channel that reads exact silence or nothing, dBV: below any converter's. */
const SILENT_FLOOR_DB = -200

export interface VerifyOptions {
  /** six or one; not said: six when an element was given a tone */
  channelKind?: ChannelKind
  /** what the bench claims to measure: a check of it that was not made fails; not said: only what was read is judged */
  capabilities?: readonly Capability[]
  /** dB that are added to each channel's level today; not said: none */
  calibrationDb?: readonly number[]
  limits?: { [limit in keyof typeof VERIFY_LIMITS]: number }
}

export interface VerifyResult {
  passed: boolean
  /** what missed, in words for the person at the bench; empty when it passed */
  reasons: string[]
  /** broadband floor of each measuring channel with today's calibration, dBV, element 1 first */
  floorDb: number[]
  /** what would have to be added to each channel's level for its tones to be right, dB; null without tones */
  correctionDb: (number | null)[]
}

interface Check extends Required<Omit<VerifyOptions, 'channelKind' | 'capabilities'>> {
  verify: BenchVerify
}

/**
 * Judges a bench's readings of the check standard: each channel's tone within 0.3 dB at two levels or more, a quiet
 * source 10 dB below the noise limits, known resistances within 10 milliohm and open, a known current. What is
 * missing or no finite level fails: a check that was not made was not passed.
 */
export function verifyBench(verify: BenchVerify, options: VerifyOptions = {}): VerifyResult {
  const { calibrationDb = [], limits = VERIFY_LIMITS, capabilities } = options
  const check: Check = { verify, calibrationDb, limits }
  const kind = options.channelKind ?? (verify.tones.some((tone) => tone.channel > 0) ? 'six' : 'one')
  const channels = kind === 'six' ? [1, 2, 3, 4, 5, 6] : [0]
  const reasons = [
    ...channels.flatMap((channel) => toneReasons(check, channel)),
    ...channels.flatMap((channel) => quietReasons(check, channel)),
    ...resistanceReasons(check, capabilities?.includes('contactResistance') ?? false),
    ...currentReasons(check, capabilities?.includes('current') ?? false),
  ]
  return {
    passed: reasons.length === 0,
    reasons,
    floorDb: channels.map((channel) => floorOf(check, channel)),
    correctionDb: channels.map((channel) => correctionOf(check, channel)),
  }
}

function nameOf(channel: number): string {
  return channel === 0 ? 'the jack' : `element ${channel}`
}

function offsetOf({ calibrationDb }: Check, channel: number): number {
  return calibrationDb[Math.max(0, channel - 1)] ?? 0
}

function isLevel(mdb: number): boolean {
  return Number.isFinite(mdb) && mdb !== SILENCE_MDB && mdb !== NOT_MEASURED_MDB
}

function tonesOf({ verify }: Check, channel: number): BenchVerify['tones'] {
  return verify.tones.filter((tone) => tone.channel === channel)
}

function toneReasons(check: Check, channel: number): string[] {
  const tones = tonesOf(check, channel)
  const reasons = tones.flatMap(({ appliedMdb, measuredMdb }) => {
    const offDb = isLevel(measuredMdb) ? (measuredMdb - appliedMdb) / 1000 + offsetOf(check, channel) : NaN
    // whole thousandths, so that rounding does not decide a miss of exactly the limit
    if (Math.round(Math.abs(offDb) * 1000) <= Math.round(check.limits.toneDb * 1000)) return []
    const what = Number.isNaN(offDb) ? 'reads nothing' : `reads ${offDb.toFixed(2)} dB off`
    return [`${nameOf(channel)} ${what} at ${(appliedMdb / 1000).toFixed(1)} dBV`]
  })
  const levels = new Set(tones.map((tone) => tone.appliedMdb))
  return levels.size < 2 ? [...reasons, `${nameOf(channel)} was not tried at two levels`] : reasons
}

function correctionOf(check: Check, channel: number): number | null {
  const tones = tonesOf(check, channel).filter((tone) => isLevel(tone.measuredMdb))
  return meanOf(tones.map((tone) => (tone.appliedMdb - tone.measuredMdb) / 1000))
}

function floorOf(check: Check, channel: number): number {
  const source = check.verify.quiet.find((quiet) => quiet.channel === channel)
  return source && isLevel(source.flatMdb)
    ? source.flatMdb / 1000 + offsetOf(check, channel)
    : SILENT_FLOOR_DB
}

function quietReasons(check: Check, channel: number): string[] {
  const source = check.verify.quiet.find((quiet) => quiet.channel === channel)
  if (!source || source.flatMdb === NOT_MEASURED_MDB)
    return [`${nameOf(channel)} was not tried with the quiet source`]
  const judge = (mdb: number, limitDb: number, weighting: string) => {
    const levelDb = mdb / 1000 + offsetOf(check, channel)
    return levelDb <= limitDb
      ? []
      : [`${nameOf(channel)} is too noisy: ${levelDb.toFixed(1)} dBV ${weighting}`]
  }
  return [
    ...judge(source.flatMdb, check.limits.quietFlatDb, 'broadband'),
    ...(source.aMdb === NOT_MEASURED_MDB ? [] : judge(source.aMdb, check.limits.quietADb, 'A-weighted')),
  ]
}

function resistanceReasons({ verify, limits }: Check, needed: boolean): string[] {
  const has = (applied: (microOhm: number | null) => boolean) =>
    verify.resistances.some((resistance) => applied(resistance.appliedMicroOhm))
  const complete =
    has((applied) => applied === 0) &&
    has((applied) => applied === null) &&
    has((applied) => (applied ?? 0) > 0)
  const reasons = verify.resistances.flatMap(({ appliedMicroOhm, measuredMicroOhm }) => {
    const measuredOhm = measuredMicroOhm === null ? Infinity : measuredMicroOhm / 1_000_000
    const read = measuredMicroOhm === null ? 'open' : `${measuredOhm.toFixed(3)} ohm`
    if (appliedMicroOhm === null) return measuredOhm >= limits.openOhm ? [] : [`open reads ${read}`]
    const offOhm = Math.abs(measuredOhm - appliedMicroOhm / 1_000_000)
    return Math.round(offOhm * 1_000_000) <= limits.resistanceOhm * 1_000_000
      ? []
      : [`${(appliedMicroOhm / 1_000_000).toFixed(3)} ohm reads ${read}`]
  })
  return needed && !complete
    ? [...reasons, 'resistance was not tried at 0 ohm, a known one and open']
    : reasons
}

function currentReasons({ verify, limits }: Check, needed: boolean): string[] {
  if (needed && verify.currents.length === 0) return ['the supply current was not tried']
  return verify.currents.flatMap(({ appliedUa, measuredUa }) =>
    Math.abs(measuredUa - appliedUa) <= limits.currentShare * Math.abs(appliedUa) + limits.currentUa
      ? []
      : [`${(appliedUa / 1000).toFixed(2)} mA reads ${(measuredUa / 1000).toFixed(2)} mA`],
  )
}

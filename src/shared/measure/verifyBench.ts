import { NOT_MEASURED_MDB, SILENCE_MDB } from '../contract/quantities.ts'
import type { BenchVerify, ChannelKind } from '../contract/frames.ts'
import type { Capability } from '../contract/rules.ts'
import { meanOf } from './meanOf.ts'

/** How far a bench may be off, and what it claims to measure. */
export interface VerifyLimits {
  channelKind: ChannelKind
  capabilities: readonly Capability[]
  /** dB that are added to each channel's level today */
  calibrationDb: readonly number[]
  /** dB that a level may be off, at each level of each channel */
  electricalDb: number
  /** ohm that a resistance may be off */
  resistanceOhm: number
  /** dBV that the quiet source may read at most, broadband */
  quietFlatDb: number
  /** share of a current, and microampere, that it may be off together */
  currentShare: number
  currentUa: number
}

/**
 * Limits of a bench's verification: +-0.3 dB electrical, +-10 milliohm (trade practice, from memory). Quiet source at
 * -85 dBV, 10 dB below the usual limit of -75; current 2 % + 5 uA: common practice, no source.
 */
export const VERIFY_LIMITS = {
  electricalDb: 0.3,
  resistanceOhm: 0.01,
  quietFlatDb: -85,
  currentShare: 0.02,
  currentUa: 5,
} as const

/** Ohm that an open contact must read at least, when it is not reported as open. */
const OPEN_OHM = 1000

export interface VerifyResult {
  passed: boolean
  /** what missed, in words; empty when it passed */
  reasons: string[]
  /** the bench's own noise floor of each channel, dBV; null where the quiet source was not read */
  floorDb: (number | null)[]
  /** what would have to be added to each channel's level for the tones to be right, dB; null without tones */
  correctionDb: (number | null)[]
}

/**
 * Judges a bench's readings of the check standard: every channel's tone at two levels or more, the quiet source, and
 * of resistances and current what the bench claims to measure. What is missing fails: a check that was not made was
 * not passed. Levels in dBV with today's calibration added.
 */
export function verifyBench(verify: BenchVerify, limits: VerifyLimits): VerifyResult {
  const channels = limits.channelKind === 'six' ? [1, 2, 3, 4, 5, 6] : [0]
  const offsets = channels.map((_, i) => limits.calibrationDb[i] ?? 0)
  const tones = channels.map((channel, i) => checkTones(verify, channel, offsets[i]!, limits))
  const quiet = channels.map((channel, i) => checkQuiet(verify, channel, offsets[i]!, limits))
  const reasons = [
    ...tones.flatMap((tone) => tone.reasons),
    ...quiet.flatMap((source) => source.reasons),
    ...(limits.capabilities.includes('contactResistance') ? checkResistances(verify, limits) : []),
    ...(limits.capabilities.includes('current') ? checkCurrents(verify, limits) : []),
  ]
  return {
    passed: reasons.length === 0,
    reasons,
    floorDb: quiet.map((source) => source.floorDb),
    correctionDb: tones.map((tone) => tone.correctionDb),
  }
}

function nameOf(channel: number): string {
  return channel === 0 ? 'The jack' : `Channel ${channel}`
}

function isLevel(mdb: number): boolean {
  return Number.isFinite(mdb) && mdb !== SILENCE_MDB && mdb !== NOT_MEASURED_MDB
}

function checkTones(verify: BenchVerify, channel: number, offsetDb: number, limits: VerifyLimits) {
  const tones = verify.tones.filter((tone) => tone.channel === channel)
  const levels = new Set(tones.map((tone) => tone.appliedMdb))
  if (levels.size < 2) {
    return { reasons: [`${nameOf(channel)} was not given the tone at two levels.`], correctionDb: null }
  }
  const reasons: string[] = []
  const corrections: number[] = []
  for (const { appliedMdb, measuredMdb } of tones) {
    const errorDb = isLevel(measuredMdb) ? measuredMdb / 1000 + offsetDb - appliedMdb / 1000 : NaN
    // whole thousandths, so that a miss of exactly the limit is not decided by rounding
    if (!(Math.round(Math.abs(errorDb) * 1000) <= limits.electricalDb * 1000)) {
      const off = Number.isNaN(errorDb) ? 'reads nothing' : `is ${errorDb.toFixed(2)} dB off`
      reasons.push(`${nameOf(channel)} ${off} at ${(appliedMdb / 1000).toFixed(1)} dBV.`)
    }
    if (isLevel(measuredMdb)) corrections.push((appliedMdb - measuredMdb) / 1000)
  }
  return { reasons, correctionDb: meanOf(corrections) }
}

function checkQuiet(verify: BenchVerify, channel: number, offsetDb: number, limits: VerifyLimits) {
  const source = verify.quiet.find((quiet) => quiet.channel === channel)
  if (!source || source.flatMdb === NOT_MEASURED_MDB) {
    return { reasons: [`${nameOf(channel)} was not given the quiet source.`], floorDb: null }
  }
  // nothing is quieter than the lowest level that travels
  const floorDb = Math.max(source.flatMdb, -300_000) / 1000 + offsetDb
  const reasons =
    floorDb <= limits.quietFlatDb
      ? []
      : [`${nameOf(channel)} is too noisy: ${floorDb.toFixed(1)} dBV on the quiet source.`]
  return { reasons, floorDb }
}

function checkResistances(verify: BenchVerify, limits: VerifyLimits): string[] {
  const short = verify.resistances.some((r) => r.appliedMicroOhm === 0)
  const open = verify.resistances.some((r) => r.appliedMicroOhm === null)
  if (!short || !open || verify.resistances.length < 3) {
    return ['Resistance was not checked at 0 ohm, at a known resistance and open.']
  }
  return verify.resistances.flatMap(({ appliedMicroOhm, measuredMicroOhm }) => {
    if (appliedMicroOhm === null) {
      const isOpen = measuredMicroOhm === null || measuredMicroOhm >= OPEN_OHM * 1_000_000
      return isOpen ? [] : [`Open reads ${(measuredMicroOhm / 1_000_000).toFixed(3)} ohm.`]
    }
    const within =
      measuredMicroOhm !== null &&
      Math.abs(measuredMicroOhm - appliedMicroOhm) <= limits.resistanceOhm * 1_000_000
    const read = measuredMicroOhm === null ? 'open' : `${(measuredMicroOhm / 1_000_000).toFixed(3)} ohm`
    return within ? [] : [`${(appliedMicroOhm / 1_000_000).toFixed(3)} ohm reads ${read}.`]
  })
}

function checkCurrents(verify: BenchVerify, limits: VerifyLimits): string[] {
  if (verify.currents.length === 0) return ['Current was not checked.']
  return verify.currents.flatMap(({ appliedUa, measuredUa }) =>
    Math.abs(measuredUa - appliedUa) <= limits.currentShare * Math.abs(appliedUa) + limits.currentUa
      ? []
      : [`${appliedUa} uA reads ${measuredUa} uA.`],
  )
}

import type { BenchVerify } from '../contract/frames.ts'
import { NOT_MEASURED_MDB, SILENCE_MDB } from '../contract/quantities.ts'

/** How far a bench may read off its check standard. Common practice and from memory; no standard names them. */
export const VERIFY_LIMITS = {
  /** dB, electrical, at each of at least two levels */
  toneDb: 0.3,
  /** ohm, four-wire */
  resistanceOhm: 0.01,
  /** dBV, of the shielded quiet source: 10 dB below the default limit of the A-weighted noise floor */
  quietADbv: -90,
  /** ohm from which the open position counts as open */
  openOhm: 1_000_000,
  /** share of the known current, and mA that are always allowed */
  currentShare: 0.03,
  currentMa: 0.05,
} as const

export interface BenchVerification {
  passed: boolean
  /** what is off, in words for the person at the bench; empty when it passed */
  reasons: string[]
  /** broadband floor of each measuring channel, dBV, element 1 first; a silent channel counts as -200 */
  floorDb: number[]
}

/** Below any converter's floor: a channel that reads exact silence. */
const SILENT_FLOOR_DBV = -200

/**
 * Judges a bench's readings of the check standard: tones within 0.3 dB at two levels on each channel, resistances
 * within 10 milliohm, a quiet source 10 dB below the noise limit, the known current. A reading that is missing or
 * not finite never passes.
 */
export function verifyBench(measured: BenchVerify): BenchVerification {
  const reasons = [
    ...toneReasons(measured),
    ...quietReasons(measured),
    ...resistanceReasons(measured),
    ...currentReasons(measured),
  ]
  return { passed: reasons.length === 0, reasons, floorDb: floorsOf(measured) }
}

function nameOf(channel: number): string {
  return channel === 0 ? 'the jack' : `element ${channel}`
}

function toneReasons({ tones }: BenchVerify): string[] {
  const reasons: string[] = []
  for (const { channel, appliedMdb, measuredMdb } of tones) {
    const isLevel = measuredMdb !== SILENCE_MDB && measuredMdb !== NOT_MEASURED_MDB
    const offDb = (measuredMdb - appliedMdb) / 1000
    if (isLevel && Math.abs(offDb) <= VERIFY_LIMITS.toneDb) continue
    const what = isLevel ? `reads ${offDb.toFixed(2)} dB off` : 'reads nothing'
    reasons.push(`${nameOf(channel)} ${what} at ${(appliedMdb / 1000).toFixed(1)} dBV`)
  }
  for (const channel of new Set(tones.map((tone) => tone.channel))) {
    const levels = new Set(tones.filter((tone) => tone.channel === channel).map((tone) => tone.appliedMdb))
    if (levels.size < 2) reasons.push(`${nameOf(channel)} was tried at one level only`)
  }
  return reasons
}

function quietReasons({ tones, quiet }: BenchVerify): string[] {
  const reasons: string[] = []
  for (const channel of new Set(tones.map((tone) => tone.channel)))
    if (!quiet.some((reading) => reading.channel === channel))
      reasons.push(`${nameOf(channel)} was not tried with the quiet source`)
  for (const { channel, flatMdb, aMdb } of quiet) {
    if (flatMdb === NOT_MEASURED_MDB) reasons.push(`${nameOf(channel)} reads nothing at the quiet source`)
    else if (aMdb !== NOT_MEASURED_MDB && !(aMdb / 1000 <= VERIFY_LIMITS.quietADbv))
      reasons.push(`${nameOf(channel)} is too noisy: ${(aMdb / 1000).toFixed(1)} dBV A-weighted`)
  }
  return reasons
}

function resistanceReasons({ resistances }: BenchVerify): string[] {
  return resistances.flatMap(({ appliedMicroOhm, measuredMicroOhm }) => {
    const measuredOhm = measuredMicroOhm === null ? Infinity : measuredMicroOhm / 1e6
    if (appliedMicroOhm === null)
      return measuredOhm >= VERIFY_LIMITS.openOhm ? [] : [`open reads ${measuredOhm.toFixed(3)} ohm`]
    const appliedOhm = appliedMicroOhm / 1e6
    if (Math.abs(measuredOhm - appliedOhm) <= VERIFY_LIMITS.resistanceOhm) return []
    return [`${appliedOhm} ohm reads ${measuredMicroOhm === null ? 'open' : `${measuredOhm.toFixed(3)} ohm`}`]
  })
}

function currentReasons({ currents }: BenchVerify): string[] {
  return currents.flatMap(({ appliedUa, measuredUa }) => {
    const allowedUa = VERIFY_LIMITS.currentMa * 1000 + VERIFY_LIMITS.currentShare * Math.abs(appliedUa)
    if (Math.abs(measuredUa - appliedUa) <= allowedUa) return []
    return [`${(appliedUa / 1000).toFixed(2)} mA reads ${(measuredUa / 1000).toFixed(2)} mA`]
  })
}

/** The measuring channels are the six elements, or the jack alone where there are none. */
function floorsOf({ quiet }: BenchVerify): number[] {
  const elements = quiet.filter((reading) => reading.channel > 0)
  const measuring = (elements.length > 0 ? elements : quiet).toSorted((a, b) => a.channel - b.channel)
  return measuring.map(({ flatMdb }) =>
    flatMdb === SILENCE_MDB || flatMdb === NOT_MEASURED_MDB ? SILENT_FLOOR_DBV : flatMdb / 1000,
  )
}

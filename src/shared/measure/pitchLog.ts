import type { PitchEvent } from '../contract/frames.ts'
import type { StringPitch } from '../contract/thresholds.ts'
import { PITCHES_KEPT, PITCH_LEAST_CONFIDENCE, PITCH_WITHIN_SEMITONES } from './constants.ts'

/** The latest pitch reports, oldest overwritten first. */
export interface PitchLog {
  kept: (PitchEvent | null)[]
  next: number
}

export function createPitchLog(): PitchLog {
  return { kept: Array.from({ length: PITCHES_KEPT }, () => null), next: 0 }
}

export function forgetPitches(log: PitchLog): void {
  log.kept.fill(null)
}

export function logPitch(log: PitchLog, event: PitchEvent): void {
  log.kept[log.next] = event
  log.next = (log.next + 1) % PITCHES_KEPT
}

/**
 * Sure reports that belong to a window, in the order that they came: at least half of the report, or half of the
 * window, lies inside it, so that a note that only just ends there is not taken for the new one. Times in tenths of
 * a millisecond of run time.
 */
export function pitchesOver(log: PitchLog, fromTenthMs: number, toTenthMs: number): PitchEvent[] {
  const found: PitchEvent[] = []
  for (let i = 0; i < PITCHES_KEPT; i++) {
    const event = log.kept[(log.next + i) % PITCHES_KEPT]
    if (!event || event.confidencePercent < PITCH_LEAST_CONFIDENCE) continue
    const end = event.startTenthMs + event.durationTenthMs
    const overlap = Math.min(end, toTenthMs) - Math.max(event.startTenthMs, fromTenthMs)
    if (2 * overlap >= Math.min(event.durationTenthMs, toTenthMs - fromTenthMs)) found.push(event)
  }
  return found
}

/**
 * Strings that a pitch can be, as a bit for each (bit 0 = string 1): those with an expected pitch within half a
 * semitone. In: thousandths of a Hz. 0: none.
 */
export function stringsOfPitch(milliHz: number, tuning: readonly StringPitch[]): number {
  let strings = 0
  for (const { stringNo, pitchesHz } of tuning) {
    for (const expectedHz of pitchesHz) {
      const semitones = 12 * Math.log2(milliHz / 1000 / expectedHz)
      if (Math.abs(semitones) <= PITCH_WITHIN_SEMITONES) strings |= 1 << (stringNo - 1)
    }
  }
  return strings
}

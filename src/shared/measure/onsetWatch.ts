import { NOT_MEASURED_MDB } from '../contract/quantities.ts'
import {
  ONSET_RISE_DB,
  OWN_FLOOR_FROM_MS,
  OWN_FLOOR_LEAST_SHARE,
  OWN_FLOOR_TO_MS,
  RINGING_DB,
  RISE_BELOW_RECENT_DB,
  RISE_DB,
  RISE_FROM_MS,
  RISE_RECENT_FROM_MS,
  RISE_TO_MS,
} from './constants.ts'
import { levelAt, loudestMdb, medianAtMost, medianMdb, type LevelRing } from './levelRing.ts'

/** Tells from frame to frame which channels stand 10 dB above their own floor. */
export interface OnsetWatch {
  /** frames back from the present one: [from, to) */
  floorFrom: number
  floorTo: number
  floorLeast: number
  riseFrom: number
  riseTo: number
  recentFrom: number
  /** the bench's own floor of each channel before calibration, thousandths of a dBV */
  rawFloorMdb: readonly number[]
  /** channels that stand above, a bit for each */
  above: number
  /** channels that must be seen not to stand above before they can have an onset, a bit for each */
  unarmed: number
}

const EVERY_CHANNEL = 0b111111

export function createOnsetWatch(frameMs: number, rawFloorMdb: readonly number[]): OnsetWatch {
  const floorFrom = OWN_FLOOR_FROM_MS / frameMs
  const floorTo = OWN_FLOOR_TO_MS / frameMs
  return {
    floorFrom,
    floorTo,
    floorLeast: Math.ceil((floorFrom - floorTo) * OWN_FLOOR_LEAST_SHARE),
    riseFrom: RISE_FROM_MS / frameMs,
    riseTo: RISE_TO_MS / frameMs,
    recentFrom: RISE_RECENT_FROM_MS / frameMs,
    rawFloorMdb,
    above: 0,
    unarmed: EVERY_CHANNEL,
  }
}

/** What stands above now is no onset: it began while nobody looked. */
export function disarmOnsets(watch: OnsetWatch): void {
  watch.above = 0
  watch.unarmed = EVERY_CHANNEL
}

/**
 * Channels whose onset is this frame, a bit for each: they stand 10 dB above their own floor (the median of their
 * frames 200 to 40 ms earlier, not below the bench's noise floor) and did not in the frame before. Where the floor is
 * not known, or the frame not measured, nothing is told and the next frame is no onset either.
 */
export function onsetsAt(watch: OnsetWatch, ring: LevelRing, frameNo: number): number {
  let above = 0
  let onsets = 0
  const from = frameNo - watch.floorFrom
  const to = frameNo - watch.floorTo
  for (let channel = 0; channel < ring.channels; channel++) {
    const bit = 1 << channel
    const level = levelAt(ring, channel, frameNo)
    const limit = level - ONSET_RISE_DB * 1000
    const stands =
      level === NOT_MEASURED_MDB
        ? null
        : watch.rawFloorMdb[channel]! <= limit &&
          medianAtMost(ring, channel, from, to, watch.floorLeast, limit)
    if (stands === null) {
      watch.unarmed |= bit
    } else if (stands) {
      above |= bit
      if (((watch.above | watch.unarmed) & bit) === 0) onsets |= bit
    } else watch.unarmed &= ~bit
  }
  watch.above = above
  return onsets
}

/** A channel's own floor before a frame, thousandths of a dBV as it came, not below the bench's; NaN: not known. */
export function ownFloorMdb(watch: OnsetWatch, ring: LevelRing, channel: number, frameNo: number): number {
  const median = medianMdb(
    ring,
    channel,
    frameNo - watch.floorFrom,
    frameNo - watch.floorTo,
    watch.floorLeast,
  )
  return Math.max(median, watch.rawFloorMdb[channel]!)
}

/**
 * Whether this frame and the one before both stand 4 dB over the median of the channel's frames 60 to 20 ms earlier:
 * a new excitation on top of what there is. Two frames, because one of a low string holds no whole period.
 */
export function risesAt(watch: OnsetWatch, ring: LevelRing, channel: number, frameNo: number): boolean {
  const level = levelAt(ring, channel, frameNo)
  const before = levelAt(ring, channel, frameNo - 1)
  if (level === NOT_MEASURED_MDB || before === NOT_MEASURED_MDB) return false
  const limit = Math.min(level, before) - RISE_DB * 1000
  return medianAtMost(ring, channel, frameNo - watch.riseFrom, frameNo - watch.riseTo, 2, limit) === true
}

/**
 * Channels on which a string that still rang was excited again without a 10 dB onset, a bit for each: it rises by
 * 4 dB over the last moment and over its own floor, that floor stands 10 dB above the muted floor, and it comes back
 * to what it was within the last half second.
 */
export function repluckedAt(
  watch: OnsetWatch,
  ring: LevelRing,
  frameNo: number,
  mutedFloorMdb: readonly number[],
): number {
  let rising = 0
  for (let channel = 0; channel < ring.channels; channel++) {
    const level = levelAt(ring, channel, frameNo)
    if (level < mutedFloorMdb[channel]! + (RINGING_DB + RISE_DB) * 1000) continue
    if (!risesAt(watch, ring, channel, frameNo)) continue
    const own = ownFloorMdb(watch, ring, channel, frameNo)
    if (!(own > mutedFloorMdb[channel]! + RINGING_DB * 1000 && level >= own + RISE_DB * 1000)) continue
    const recent = loudestMdb(ring, channel, frameNo - watch.recentFrom, frameNo - watch.riseTo)
    const now = Math.max(level, levelAt(ring, channel, frameNo - 1))
    if (now >= recent - RISE_BELOW_RECENT_DB * 1000) rising |= 1 << channel
  }
  return rising
}

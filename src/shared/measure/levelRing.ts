import { NOT_MEASURED_MDB } from '../contract/quantities.ts'
import type { Frame } from '../contract/frames.ts'
import { powerOfMdb } from './powerOfMdb.ts'

/** Frames kept: 640 ms of 5 ms frames, more than any window looks back. A power of two, so that a mask wraps it. */
const KEPT = 128
const MASK = KEPT - 1

/** The latest frames of each channel, as they came; the only history that measuring keeps of levels. */
export interface LevelRing {
  channels: number
  flat: Int32Array
  a: Int32Array
  clipped: Int32Array
}

const sorting = new Int32Array(KEPT)

export function createLevelRing(channels: number): LevelRing {
  const ring = {
    channels,
    flat: new Int32Array(channels * KEPT),
    a: new Int32Array(channels * KEPT),
    clipped: new Int32Array(KEPT),
  }
  forgetLevels(ring)
  return ring
}

/** Starts the history again: everything before is not measured. */
export function forgetLevels(ring: LevelRing): void {
  ring.flat.fill(NOT_MEASURED_MDB)
  ring.a.fill(NOT_MEASURED_MDB)
  ring.clipped.fill(0)
}

export function pushFrame(ring: LevelRing, frameNo: number, frame: Frame): void {
  const at = frameNo & MASK
  const { levelMdb, levelAMdb } = frame
  for (let channel = 0; channel < ring.channels; channel++) {
    const place = channel * KEPT + at
    ring.flat[place] = channel < levelMdb.length ? levelMdb[channel]! : NOT_MEASURED_MDB
    ring.a[place] = channel < levelAMdb.length ? levelAMdb[channel]! : NOT_MEASURED_MDB
  }
  ring.clipped[at] = frame.clipped
}

/** Flat level of a channel in a kept frame, thousandths of a dBV as it came. */
export function levelAt(ring: LevelRing, channel: number, frameNo: number): number {
  return ring.flat[channel * KEPT + (frameNo & MASK)]!
}

/** Clipped samples of the frames [from, to). */
export function clippedIn(ring: LevelRing, from: number, to: number): number {
  let clipped = 0
  for (let frameNo = from; frameNo < to; frameNo++) clipped += ring.clipped[frameNo & MASK]!
  return clipped
}

/**
 * Median of a channel's measured frames in [from, to), thousandths of a dBV, silence lowest; NaN when fewer than
 * `least` of them are measured.
 */
export function medianMdb(ring: LevelRing, channel: number, from: number, to: number, least: number): number {
  let count = 0
  for (let frameNo = Math.max(0, from); frameNo < to; frameNo++) {
    const value = ring.flat[channel * KEPT + (frameNo & MASK)]!
    if (value === NOT_MEASURED_MDB) continue
    let place = count++
    while (place > 0 && sorting[place - 1]! > value) {
      sorting[place] = sorting[place - 1]!
      place--
    }
    sorting[place] = value
  }
  if (count === 0 || count < least) return NaN
  const upper = count >> 1
  return count % 2 === 1 ? sorting[upper]! : (sorting[upper - 1]! + sorting[upper]!) / 2
}

/**
 * Whether that median is at most `limit`, told by counting, which is what every frame of every channel can afford.
 * null when fewer than `least` frames are measured.
 */
export function medianAtMost(
  ring: LevelRing,
  channel: number,
  from: number,
  to: number,
  least: number,
  limit: number,
): boolean | null {
  const { flat } = ring
  const base = channel * KEPT
  let measured = 0
  let below = 0
  for (let frameNo = from < 0 ? 0 : from; frameNo < to; frameNo++) {
    const value = flat[base + (frameNo & MASK)]!
    if (value === NOT_MEASURED_MDB) continue
    measured++
    if (value <= limit) below++
  }
  if (measured === 0 || measured < least) return null
  if (2 * below !== measured) return 2 * below > measured
  return medianMdb(ring, channel, from, to, least) <= limit
}

/** Loudest measured frame of a channel in [from, to), thousandths of a dBV; -Infinity when none is measured. */
export function loudestMdb(ring: LevelRing, channel: number, from: number, to: number): number {
  let loudest = -Infinity
  for (let frameNo = Math.max(0, from); frameNo < to; frameNo++) {
    const value = levelAt(ring, channel, frameNo)
    if (value !== NOT_MEASURED_MDB && value > loudest) loudest = value
  }
  return loudest
}

/** Mean power of a channel over [from, to), re (1 V)^2; NaN unless every frame is measured. */
export function meanPowerIn(
  ring: LevelRing,
  channel: number,
  from: number,
  to: number,
  weighting: 'flat' | 'a',
): number {
  const levels = weighting === 'flat' ? ring.flat : ring.a
  let power = 0
  for (let frameNo = from; frameNo < to; frameNo++) {
    // powerOfMdb gives NaN for a frame that is not measured, and NaN stays in the sum
    power += powerOfMdb(levels[channel * KEPT + (frameNo & MASK)]!)
  }
  return power / (to - from)
}

/**
 * Slope of a channel's level over [from, to) by least squares, dB per frame; NaN when fewer than three frames hold a
 * level. Silence has no level in dB and is left out.
 */
export function slopeDbPerFrame(ring: LevelRing, channel: number, from: number, to: number): number {
  let count = 0
  let sumX = 0
  let sumY = 0
  let sumXx = 0
  let sumXy = 0
  for (let frameNo = from; frameNo < to; frameNo++) {
    const value = levelAt(ring, channel, frameNo)
    if (!(Math.abs(value) < NOT_MEASURED_MDB)) continue
    const x = frameNo - from
    const y = value / 1000
    count++
    sumX += x
    sumY += y
    sumXx += x * x
    sumXy += x * y
  }
  if (count < 3) return NaN
  return (count * sumXy - sumX * sumY) / (count * sumXx - sumX * sumX)
}

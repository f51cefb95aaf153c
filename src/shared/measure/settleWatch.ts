import type { Frame } from '../contract/frames.ts'
import { BLOCK_MS, SETTLE_DRIFT_DB_PER_S, SETTLE_LEAST_MS } from './constants.ts'
import { powerOfMdb } from './powerOfMdb.ts'

/** Blocks that are kept, and of one second: the first second of the last three against the last one. */
const KEPT = SETTLE_LEAST_MS / BLOCK_MS
const SECOND = 1000 / BLOCK_MS
/** seconds between the middles of the two */
const LEVER_S = (SETTLE_LEAST_MS - 1000) / 1000

/** Drift of every channel's floor after plugging in. */
export interface SettleWatch {
  channels: number
  blockFrames: number
  /** frames since the plug went in */
  frames: number
  /** 200 ms sums of each channel, ring */
  blocks: Float64Array
  current: Float64Array
}

export function createSettleWatch(channels: number, frameMs: number): SettleWatch {
  return {
    channels,
    blockFrames: BLOCK_MS / frameMs,
    frames: 0,
    blocks: new Float64Array(KEPT * channels),
    current: new Float64Array(channels),
  }
}

export function restartSettleWatch(watch: SettleWatch): void {
  watch.frames = 0
  watch.current.fill(0)
}

export function takeSettleFrame(watch: SettleWatch, frame: Frame): void {
  for (let channel = 0; channel < watch.channels; channel++) {
    watch.current[channel]! += powerOfMdb(frame.levelMdb[channel]!)
  }
  watch.frames++
  if (watch.frames % watch.blockFrames !== 0) return
  const base = ((watch.frames / watch.blockFrames - 1) % KEPT) * watch.channels
  watch.blocks.set(watch.current, base)
  watch.current.fill(0)
}

/**
 * Whether, at the end of a block, every measured channel's level over the last second differs from that two seconds
 * earlier by less than 0.1 dB/s.
 */
export function hasSettled(watch: SettleWatch): boolean {
  const blocks = watch.frames / watch.blockFrames
  if (blocks < KEPT || !Number.isInteger(blocks)) return false
  for (let channel = 0; channel < watch.channels; channel++) {
    let early = 0
    let late = 0
    for (let i = 0; i < SECOND; i++) {
      early += watch.blocks[((blocks - KEPT + i) % KEPT) * watch.channels + channel]!
      late += watch.blocks[((blocks - 1 - i) % KEPT) * watch.channels + channel]!
    }
    if (Number.isNaN(early + late) || early === late) continue
    if (!(Math.abs(10 * Math.log10(late / early)) < SETTLE_DRIFT_DB_PER_S * LEVER_S)) return false
  }
  return true
}

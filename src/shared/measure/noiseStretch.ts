import type { Frame } from '../contract/frames.ts'
import { BLOCK_MS, QUIET_SPREAD_DB } from './constants.ts'
import { powerOfMdb } from './powerOfMdb.ts'

/** Points of the circuit whose power is summed: flat and A of each of up to six channels, then the jack. */
const A_OFFSET = 6
const JACK = 12
const JACK_A = 13
const POINTS = 14

/** Power sums over one stretch, for each point; NaN where a frame was not measured. */
export interface NoiseSums {
  fromFrame: number
  /** last frame in it */
  toFrame: number
  power: Float64Array
  squares: Float64Array
}

/**
 * Finds a muted stretch by itself: no onset in it, and its 200 ms blocks no more than 3 dB apart on any channel. Works
 * in blocks, so a frame costs its own power sums only.
 */
export interface NoiseStretch {
  channels: number
  frameMs: number
  blockFrames: number
  /** blocks that make a stretch */
  wanted: number
  power: Float64Array
  squares: Float64Array
  inBlock: number
  onsetInBlock: boolean
  /** the latest `wanted` blocks, sums of each point, ring */
  blockPower: Float64Array
  blockSquares: Float64Array
  /** blocks since the stretch last started again, and without an onset up to now */
  blocks: number
  clean: number
  /** blocks of the quiet stretch up to now, at most `wanted`, and the frame that it began with */
  quiet: number
  quietFromFrame: number
}

export function createNoiseStretch(channels: number, frameMs: number, stretchMs: number): NoiseStretch {
  const wanted = Math.ceil(stretchMs / BLOCK_MS)
  return {
    channels,
    frameMs,
    blockFrames: BLOCK_MS / frameMs,
    wanted,
    power: new Float64Array(POINTS),
    squares: new Float64Array(POINTS),
    inBlock: 0,
    onsetInBlock: false,
    blockPower: new Float64Array(wanted * POINTS),
    blockSquares: new Float64Array(wanted * POINTS),
    blocks: 0,
    clean: 0,
    quiet: 0,
    quietFromFrame: 0,
  }
}

/** Starts the search again. */
export function restartNoiseStretch(stretch: NoiseStretch): void {
  stretch.power.fill(0)
  stretch.squares.fill(0)
  stretch.inBlock = 0
  stretch.onsetInBlock = false
  stretch.blocks = 0
  stretch.clean = 0
  stretch.quiet = 0
}

function addPower(stretch: NoiseStretch, point: number, mdb: number): void {
  const power = powerOfMdb(mdb)
  stretch.power[point]! += power
  stretch.squares[point]! += power * power
}

/** Takes one frame; `disturbed`: a channel stands 10 dB above its own floor. */
export function takeNoiseFrame(
  stretch: NoiseStretch,
  frameNo: number,
  frame: Frame,
  disturbed: boolean,
): void {
  for (let channel = 0; channel < stretch.channels; channel++) {
    addPower(stretch, channel, frame.levelMdb[channel]!)
    addPower(stretch, A_OFFSET + channel, frame.levelAMdb[channel]!)
  }
  addPower(stretch, JACK, frame.jackMdb)
  addPower(stretch, JACK_A, frame.jackAMdb)
  if (disturbed) stretch.onsetInBlock = true
  if (++stretch.inBlock === stretch.blockFrames) closeBlock(stretch, frameNo)
}

/** There is a window as long as a stretch, quiet or not. */
export function hasWindow(stretch: NoiseStretch): boolean {
  return stretch.blocks >= stretch.wanted
}

/** The quiet stretch is as long as it must be. */
export function isQuiet(stretch: NoiseStretch): boolean {
  return stretch.quiet === stretch.wanted
}

function closeBlock(stretch: NoiseStretch, frameNo: number): void {
  const base = (stretch.blocks % stretch.wanted) * POINTS
  for (let point = 0; point < POINTS; point++) {
    stretch.blockPower[base + point] = stretch.power[point]!
    stretch.blockSquares[base + point] = stretch.squares[point]!
  }
  stretch.power.fill(0)
  stretch.squares.fill(0)
  stretch.inBlock = 0
  stretch.blocks++
  stretch.clean = stretch.onsetInBlock ? 0 : stretch.clean + 1
  stretch.onsetInBlock = false
  const wasQuiet = isQuiet(stretch)
  stretch.quiet = alikeBlocks(stretch)
  // a stretch that was long enough and goes on keeps its beginning, so that a hum report over more of it fits
  if (!(wasQuiet && isQuiet(stretch))) {
    stretch.quietFromFrame = frameNo + 1 - stretch.quiet * stretch.blockFrames
  }
}

/** How many of the latest clean blocks, going back, are alike on every flat point. */
function alikeBlocks(stretch: NoiseStretch): number {
  const ratio = Math.pow(10, QUIET_SPREAD_DB / 10)
  const most = Math.min(stretch.clean, stretch.wanted)
  let alike = most
  for (let point = 0; point <= JACK; point++) {
    if (point >= stretch.channels && point < JACK) continue
    let low = Infinity
    let high = 0
    for (let back = 0; back < alike; back++) {
      const power = stretch.blockPower[blockBase(stretch, back) + point]!
      // a point that is not measured says nothing about quiet
      if (Number.isNaN(power)) continue
      low = Math.min(low, power)
      high = Math.max(high, power)
      if (high > low * ratio) alike = back
    }
  }
  return alike
}

/** Place of the block that is `back` blocks before the latest. */
function blockBase(stretch: NoiseStretch, back: number): number {
  return ((stretch.blocks - 1 - back) % stretch.wanted) * POINTS
}

/** Sums over the latest `wanted` blocks, oldest first. */
export function latestSums(stretch: NoiseStretch, lastFrame: number): NoiseSums {
  const sums: NoiseSums = {
    fromFrame: lastFrame + 1 - stretch.wanted * stretch.blockFrames,
    toFrame: lastFrame,
    power: new Float64Array(POINTS),
    squares: new Float64Array(POINTS),
  }
  for (let back = stretch.wanted - 1; back >= 0; back--) {
    const base = blockBase(stretch, back)
    for (let point = 0; point < POINTS; point++) {
      sums.power[point]! += stretch.blockPower[base + point]!
      sums.squares[point]! += stretch.blockSquares[base + point]!
    }
  }
  return sums
}

/** Noise of one point over a stretch. */
export interface PointNoise {
  /** mean power, re (1 V)^2, 0 for silence */
  power: number
  /** standard uncertainty of its level from its own unsteadiness, dB */
  uDb: number
  frames: number
}

/** Noise of channel 0.. or of the jack over a stretch; null when a frame of it was not measured. */
export function noiseAt(
  sums: NoiseSums,
  point: { channel: number } | 'jack',
  weighting: 'flat' | 'a',
): PointNoise | null {
  const place =
    point === 'jack'
      ? weighting === 'flat'
        ? JACK
        : JACK_A
      : point.channel + (weighting === 'flat' ? 0 : A_OFFSET)
  const frames = sums.toFrame - sums.fromFrame + 1
  const power = sums.power[place]! / frames
  if (!Number.isFinite(power)) return null
  if (power === 0) return { power, uDb: 0, frames }
  const variance = Math.max(0, sums.squares[place]! / frames - power * power)
  return { power, uDb: (10 / Math.LN10) * Math.sqrt(variance / frames / (power * power)), frames }
}

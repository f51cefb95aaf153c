import type { Frame, FrameMs } from '../../src/shared/contract/frames.ts'
import { NOT_MEASURED_MDB, SILENCE_MDB } from '../../src/shared/contract/quantities.ts'
import { aWeighting } from './aWeighting.ts'
import { BiquadCascade } from './biquad.ts'
import { measuringBand } from './measuringBand.ts'

const LOWEST_MDB = -300_000
const HIGHEST_MDB = 100_000
/** So many samples in a row at the end of the scale, all of one sign, are clipped; fewer is a peak that just fits. */
export const CLIPPED_RUN = 3

export interface FrameSettings {
  rateHz: number
  frameMs: FrameMs
  /** one for each channel: dBV minus mathematical rms dBFS (a full-scale sine is -3.01 dBFS) */
  offsetDb: readonly number[]
  /** the largest magnitude that the recording can hold, 1 or a little below */
  fullScale: number
}

/**
 * First sample of a frame. At 44.1 kHz a frame of 5 ms is 220.5 samples: frames then take 220 and 221 in turn, and
 * each level is the mean over the samples that it has.
 */
export function frameStart(frameNo: number, frameMs: FrameMs, rateHz: number): number {
  return Math.floor((frameNo * frameMs * rateHz) / 1000)
}

/** rms of samples as level: thousandths of a dB re 1 V, SILENCE_MDB where every sample is zero. */
export function levelMdb(meanSquare: number, offsetDb: number): number {
  if (!(meanSquare > 0)) return SILENCE_MDB
  const mdb = Math.round(1000 * (10 * Math.log10(meanSquare) + offsetDb))
  if (mdb < LOWEST_MDB) return SILENCE_MDB
  return Math.min(mdb, HIGHEST_MDB)
}

/** Turns the samples of one frame after the other into levels; six channels, or one that is the jack. */
export class FrameAnalyser {
  private readonly settings: FrameSettings
  private readonly flat: BiquadCascade[]
  private readonly weighted: BiquadCascade[]
  private readonly clipping: ClipCounter[]
  private readonly work: Float64Array
  /** band-limited samples of the last frame, one array a channel */
  readonly bandSamples: Float64Array[]

  constructor(settings: FrameSettings) {
    this.settings = settings
    const channels = settings.offsetDb.length
    const longest = Math.ceil((settings.frameMs * settings.rateHz) / 1000)
    const each = <T>(make: () => T) => Array.from({ length: channels }, make)
    const band = measuringBand(settings.rateHz)
    const weighting = aWeighting(settings.rateHz)
    this.flat = each(() => new BiquadCascade(band))
    this.weighted = each(() => new BiquadCascade(weighting))
    this.clipping = each(() => new ClipCounter(settings.fullScale))
    this.work = new Float64Array(longest)
    this.bandSamples = each(() => new Float64Array(longest))
  }

  /** `count` samples of each channel, in the order of time; what a recording cannot tell stays 'not measured'. */
  analyse(channels: readonly Float64Array[], count: number): Frame {
    const level: number[] = []
    const levelA: number[] = []
    let clipped = 0
    for (let c = 0; c < this.flat.length; c++) {
      const samples = channels[c]!
      const band = this.bandSamples[c]!
      for (let i = 0; i < count; i++) band[i] = samples[i]!
      this.flat[c]!.process(band, count)
      for (let i = 0; i < count; i++) this.work[i] = band[i]!
      this.weighted[c]!.process(this.work, count)
      const silent = isSilent(samples, count)
      const offsetDb = this.settings.offsetDb[c]!
      level.push(silent ? SILENCE_MDB : levelMdb(meanSquare(band, count), offsetDb))
      levelA.push(silent ? SILENCE_MDB : levelMdb(meanSquare(this.work, count), offsetDb))
      clipped += this.clipping[c]!.count(samples, count)
    }
    const jack = this.flat.length === 1
    return {
      levelMdb: level,
      levelAMdb: levelA,
      jackMdb: jack ? level[0]! : NOT_MEASURED_MDB,
      jackAMdb: jack ? levelA[0]! : NOT_MEASURED_MDB,
      clipped: Math.min(clipped, 100_000),
      plugged: null,
      ringSleeveClosed: null,
      tipClosed: null,
      currentUa: null,
      batteryMv: null,
    }
  }
}

function isSilent(samples: Float64Array, count: number): boolean {
  for (let i = 0; i < count; i++) if (samples[i] !== 0) return false
  return true
}

function meanSquare(samples: Float64Array, count: number): number {
  let sum = 0
  for (let i = 0; i < count; i++) sum += samples[i]! * samples[i]!
  return sum / count
}

/** Counts samples that belong to a run at the end of the scale; a run may cross from one frame into the next. */
class ClipCounter {
  private readonly fullScale: number
  private run = 0
  private sign = 0

  constructor(fullScale: number) {
    this.fullScale = fullScale
  }

  /** Clipped samples; the first ones of a run are counted in the frame in which the run becomes one. */
  count(samples: Float64Array, count: number): number {
    let clipped = 0
    for (let i = 0; i < count; i++) {
      const x = samples[i]!
      const sign = x >= this.fullScale ? 1 : x <= -this.fullScale ? -1 : 0
      if (sign === 0) {
        this.run = 0
        continue
      }
      this.run = sign === this.sign ? this.run + 1 : 1
      this.sign = sign
      if (this.run === CLIPPED_RUN) clipped += CLIPPED_RUN
      else if (this.run > CLIPPED_RUN) clipped += 1
    }
    return clipped
  }
}

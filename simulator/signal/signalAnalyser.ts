import type { BenchEvent, Frame } from '../../src/shared/contract/frames.ts'
import { FrameAnalyser, frameStart, levelMdb } from './frameAnalyser.ts'
import type { FrameSettings } from './frameAnalyser.ts'
import { HUM_ALGORITHM, HumDecimator, humPower } from './hum.ts'
import { OnsetDetector } from './onsetDetector.ts'
import { findPitches, PITCH_ALGORITHM } from './pitch.ts'
import { QuietStretch } from './quietStretch.ts'
import { SampleHistory } from './sampleHistory.ts'

/** Names and versions of what turns samples into frames and events. */
export const SIGNAL_ALGORITHMS = {
  level: 'rms-frames-1',
  aWeighting: 'iec61672-fitted-biquads-1',
  clipping: 'runs-of-3-at-full-scale-1',
  onset: 'median-rise-1',
  pitch: PITCH_ALGORITHM,
  hum: HUM_ALGORITHM,
} as const

/** The pitch is read from this long after the onset ... */
const PITCH_FROM_MS = 40
/** ... to here, and reported with the frame that ends at PITCH_BY_MS. */
const PITCH_TO_MS = 250
const PITCH_BY_MS = 260
/** One pluck begins on several channels at almost the same time. */
const LOOKS_APART_MS = 30
/** Channels this far below the loudest only hear it. */
const ALONG_DB = 10
/** Below -110 dBFS nothing is a floor: it is quieter than a 16 bit recording can be. */
const LOWEST_FLOOR_DBFS = -110
const HUM_EVERY_MS = 400

export interface SignalSettings extends FrameSettings {
  mainsHz: 50 | 60
  /** from the server's order */
  noiseStretchMs: number
  expectedHz: readonly (readonly number[])[]
  /** number of the first frame, where samples do not begin with the run */
  firstFrame?: number
}

/**
 * Samples of one frame after the other in; frames, pitches and hum out. One channel is the jack (channel 0 of an
 * event), six are the elements 1 to 6.
 */
export class SignalAnalyser {
  private readonly settings: SignalSettings
  private readonly frames: FrameAnalyser
  private readonly onsets: OnsetDetector[]
  private readonly history: SampleHistory[]
  private readonly decimators: HumDecimator[]
  private readonly humHistory: SampleHistory[]
  private readonly quiet: QuietStretch
  private looks: { frame: number }[] = []
  private humSamples = 0
  private frameNo: number
  /** number of the first sample that this analyser sees */
  private readonly firstSample: number

  constructor(settings: SignalSettings) {
    this.settings = settings
    const { rateHz, frameMs, offsetDb, noiseStretchMs, firstFrame = 0 } = settings
    this.frameNo = firstFrame
    this.firstSample = frameStart(firstFrame, frameMs, rateHz)
    const longest = Math.ceil((frameMs * rateHz) / 1000)
    this.frames = new FrameAnalyser(settings)
    this.onsets = offsetDb.map(
      (offset) => new OnsetDetector(frameMs, Math.round(1000 * (LOWEST_FLOOR_DBFS + offset))),
    )
    this.history = offsetDb.map(() => new SampleHistory(Math.ceil((rateHz * 2 * PITCH_BY_MS) / 1000)))
    this.decimators = offsetDb.map(() => new HumDecimator(rateHz, longest))
    const humLength = Math.ceil((this.decimators[0]!.rateHz * (noiseStretchMs + 100)) / 1000)
    this.humHistory = offsetDb.map(() => new SampleHistory(humLength))
    this.quiet = new QuietStretch(offsetDb.length, frameMs, noiseStretchMs, HUM_EVERY_MS)
  }

  /** The next frame, n: numbers count from firstFrame, its samples are those from frameStart(n) to frameStart(n + 1). */
  next(channels: readonly Float64Array[], count: number): { frame: Frame; events: BenchEvent[] } {
    const frameNo = this.frameNo++
    const frame = this.frames.analyse(channels, count)
    this.keep(count)
    const begins = frame.levelMdb.map((level, channel) => this.onsets[channel]!.push(level)).some(Boolean)
    const last = this.looks.at(-1)
    if (begins && (!last || (frameNo - last.frame) * this.settings.frameMs >= LOOKS_APART_MS))
      this.looks.push({ frame: frameNo })
    return { frame, events: [...this.pitchEvents(frameNo), ...this.humEvents(frameNo, frame)] }
  }

  private keep(count: number): void {
    let kept = 0
    this.frames.bandSamples.forEach((samples, channel) => {
      this.history[channel]!.push(samples, count)
      const slow = this.decimators[channel]!.take(samples, count)
      this.humHistory[channel]!.push(slow.samples, slow.count)
      kept = slow.count
    })
    this.humSamples += kept
  }

  private channelNo(index: number): number {
    return this.onsets.length === 1 ? 0 : index + 1
  }

  private pitchEvents(frameNo: number): BenchEvent[] {
    const { frameMs } = this.settings
    const due = this.looks.filter((look) => (frameNo + 1 - look.frame) * frameMs >= PITCH_BY_MS)
    if (due.length === 0) return []
    this.looks = this.looks.filter((look) => !due.includes(look))
    return due.flatMap((look) => this.pitchesSince(look.frame, frameNo))
  }

  private pitchesSince(onsetFrame: number, frameNo: number): BenchEvent[] {
    const { frameMs, rateHz, expectedHz, offsetDb } = this.settings
    const onset = frameStart(onsetFrame, frameMs, rateHz) - this.firstSample
    const from = onset + Math.round((PITCH_FROM_MS * rateHz) / 1000)
    const count = Math.round(((PITCH_TO_MS - PITCH_FROM_MS) * rateHz) / 1000)
    const pieces = this.history.map((history) => history.read(from, count))
    const levels = pieces.map((piece, i) => (piece ? levelMdb(meanSquareOf(piece), offsetDb[i]!) : -Infinity))
    const loudest = Math.max(...levels)
    return pieces.flatMap((piece, index): BenchEvent[] => {
      if (!piece || levels[index]! < loudest - ALONG_DB * 1000) return []
      return findPitches(piece, rateHz, expectedHz).map(({ hz, confidence }) => ({
        kind: 'pitch',
        frame: frameNo,
        startTenthMs: (onsetFrame * frameMs + PITCH_FROM_MS) * 10,
        durationTenthMs: (PITCH_TO_MS - PITCH_FROM_MS) * 10,
        channel: this.channelNo(index),
        milliHz: Math.round(hz * 1000),
        confidencePercent: Math.round(confidence * 100),
      }))
    })
  }

  private humEvents(frameNo: number, frame: Frame): BenchEvent[] {
    const { frameMs, noiseStretchMs, mainsHz, offsetDb } = this.settings
    if (!this.quiet.push(frame.levelMdb)) return []
    const slowRate = this.decimators[0]!.rateHz
    const count = Math.floor((slowRate * noiseStretchMs) / 1000)
    return this.humHistory.flatMap((history, index): BenchEvent[] => {
      const piece = history.read(this.humSamples - count, count)
      if (!piece) return []
      return [
        {
          kind: 'hum',
          frame: frameNo,
          startTenthMs: ((frameNo + 1) * frameMs - noiseStretchMs) * 10,
          durationTenthMs: noiseStretchMs * 10,
          channel: this.channelNo(index),
          mainsHz,
          levelMdb: levelMdb(humPower(piece, slowRate, mainsHz), offsetDb[index]!),
        },
      ]
    })
  }
}

function meanSquareOf(samples: Float64Array): number {
  let sum = 0
  for (let i = 0; i < samples.length; i++) sum += samples[i]! * samples[i]!
  return sum / samples.length
}

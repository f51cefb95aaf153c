import { randomUUID } from 'node:crypto'
import type { BenchVerify } from '../../src/shared/contract/frames.ts'
import { NOT_MEASURED_MDB, SILENCE_MDB } from '../../src/shared/contract/quantities.ts'
import { FrameAnalyser, frameStart, levelMdb } from '../signal/frameAnalyser.ts'
import type { FrameSettings } from '../signal/frameAnalyser.ts'

/** Mathematical rms of the computed tones, dB re full scale. */
const TONES_DBFS = [-10, -50]
const TONE_HZ = 1000
const FRAMES = 60
/** Frames after the filters have settled. */
const READ_FROM = 20

/**
 * Verifies what a recording's bench consists of: the program that turns samples into levels. Computed tones at two
 * levels and digital silence go through it, with the offset that the recording is read with. Whether that offset is
 * right for the recorder is nothing that the program can tell.
 */
export function verifyAnalysis(settings: FrameSettings): BenchVerify {
  const tones = TONES_DBFS.map((dbfs) => ({ dbfs, read: readTone(settings, dbfs) }))
  const silence = readTone(settings, -Infinity)
  const channels = settings.offsetDb.map((_, index) => index)
  const channelNo = (index: number) => (channels.length === 1 ? 0 : index + 1)
  return {
    id: randomUUID(),
    checkStandard: 'computed tones and silence',
    tones: tones.flatMap(({ dbfs, read }) =>
      channels.map((index) => ({
        channel: channelNo(index),
        appliedMdb: Math.round(1000 * (dbfs + settings.offsetDb[index]!)),
        measuredMdb: read.flat[index]!,
      })),
    ),
    quiet: channels.map((index) => ({
      channel: channelNo(index),
      flatMdb: silence.flat[index]!,
      aMdb: silence.a[index]!,
    })),
    resistances: [],
    currents: [],
  }
}

/** Energy means of the settled frames of every channel. */
function readTone(settings: FrameSettings, dbfs: number): { flat: number[]; a: number[] } {
  const { rateHz, frameMs, offsetDb } = settings
  const analyser = new FrameAnalyser(settings)
  const peak = Math.SQRT2 * 10 ** (dbfs / 20)
  const flat = offsetDb.map(() => 0)
  const a = offsetDb.map(() => 0)
  for (let frameNo = 0; frameNo < FRAMES; frameNo++) {
    const from = frameStart(frameNo, frameMs, rateHz)
    const count = frameStart(frameNo + 1, frameMs, rateHz) - from
    const samples = Float64Array.from(
      { length: count },
      (_, i) => peak * Math.sin((2 * Math.PI * TONE_HZ * (from + i)) / rateHz),
    )
    const frame = analyser.analyse(
      offsetDb.map(() => samples),
      count,
    )
    if (frameNo < READ_FROM) continue
    offsetDb.forEach((_, index) => {
      flat[index]! += powerOf(frame.levelMdb[index]!) / (FRAMES - READ_FROM)
      a[index]! += powerOf(frame.levelAMdb[index]!) / (FRAMES - READ_FROM)
    })
  }
  return { flat: flat.map((power) => levelMdb(power, 0)), a: a.map((power) => levelMdb(power, 0)) }
}

function powerOf(mdb: number): number {
  return mdb === SILENCE_MDB || mdb === NOT_MEASURED_MDB ? 0 : 10 ** (mdb / 10_000)
}

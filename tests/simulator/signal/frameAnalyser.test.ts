import { describe, expect, it } from 'vitest'
import { Frame } from '../../../src/shared/contract/frames.ts'
import type { FrameMs } from '../../../src/shared/contract/frames.ts'
import { NOT_MEASURED_MDB, SILENCE_MDB } from '../../../src/shared/contract/quantities.ts'
import { FrameAnalyser, frameStart, levelMdb } from '../../../simulator/signal/frameAnalyser.ts'
import { sine } from '../../helpers/signals.ts'

function framesOf(
  channels: Float64Array[],
  rateHz: number,
  frameMs: FrameMs = 10,
  offsetDb = 0,
  fullScale = 1,
) {
  const analyser = new FrameAnalyser({
    rateHz,
    frameMs,
    fullScale,
    offsetDb: channels.map(() => offsetDb),
  })
  const frames: Frame[] = []
  for (;;) {
    const [from, to] = [frames.length, frames.length + 1].map((n) => frameStart(n, frameMs, rateHz))
    if (to! > channels[0]!.length) return frames
    frames.push(
      analyser.analyse(
        channels.map((samples) => samples.subarray(from, to)),
        to! - from!,
      ),
    )
  }
}

describe('frameStart()', () => {
  it.each<[FrameMs, number, number[]]>([
    [10, 44_100, [441, 441, 441, 441]],
    [5, 44_100, [220, 221, 220, 221]],
    [5, 48_000, [240, 240, 240, 240]],
    [10, 96_000, [960, 960, 960, 960]],
  ])('cuts frames of %i ms at %i Hz into %j samples', (frameMs, rateHz, counts) => {
    const starts = [0, 1, 2, 3, 4].map((n) => frameStart(n, frameMs, rateHz))
    expect(counts).toEqual([0, 1, 2, 3].map((n) => starts[n + 1]! - starts[n]!))
  })

  it('does not drift: an hour of 5 ms frames at 44.1 kHz is an hour of samples', () => {
    expect(frameStart(720_000, 5, 44_100)).toBe(44_100 * 3600)
  })
})

describe('levelMdb()', () => {
  it('is the mathematical rms re full scale plus the offset, in whole thousandths', () => {
    expect(levelMdb(0.5, 0)).toBe(-3010)
    expect(levelMdb(1, 6.5)).toBe(6500)
  })

  it('gives the value for silence when there is nothing, or nothing that physics allows', () => {
    expect(levelMdb(0, 0)).toBe(SILENCE_MDB)
    expect(levelMdb(1e-40, 0)).toBe(SILENCE_MDB)
    expect(levelMdb(NaN, 0)).toBe(SILENCE_MDB)
  })
})

describe('FrameAnalyser', () => {
  it.each<[number, FrameMs]>([
    [44_100, 5],
    [44_100, 10],
    [48_000, 5],
    [48_000, 10],
    [96_000, 10],
  ])(
    'reads a full-scale sine of 1 kHz as -3.01 dB, flat and A, at %i Hz in frames of %i ms',
    (rateHz, ms) => {
      const frames = framesOf([sine(rateHz, 1000, rateHz, 1)], rateHz, ms)
      expect(frames).toHaveLength(1000 / ms)
      for (const frame of frames.slice(-20)) {
        // 221 samples are a little more than five periods
        expect(Math.abs(frame.levelMdb[0]! + 3010)).toBeLessThan(ms === 5 && rateHz === 44_100 ? 25 : 10)
        expect(Math.abs(frame.levelAMdb[0]! + 3010)).toBeLessThan(ms === 5 && rateHz === 44_100 ? 25 : 10)
      }
    },
  )

  it('adds the offset and takes a steady offset of the converter off', () => {
    const tone = sine(48_000, 200, 48_000, 0.01).map((x) => x + 0.05)
    const last = framesOf([tone], 48_000, 10, 12).at(-1)!
    expect(Math.abs(last.levelMdb[0]! - (-40 - 3.01 + 12) * 1000)).toBeLessThan(15)
  })

  it('hides a hum of 50 Hz from the A-weighted level as the standard says', () => {
    const frames = framesOf([sine(96_000, 50, 48_000, 0.1)], 48_000)
    const mean = (pick: (f: Frame) => number) =>
      10 * Math.log10(frames.slice(100).reduce((sum, f) => sum + 10 ** (pick(f) / 10_000), 0) / 100)
    // -30.275 dB at 50 Hz: formula of IEC 61672-1
    expect(mean((f) => f.levelAMdb[0]!) - mean((f) => f.levelMdb[0]!)).toBeCloseTo(-30.275, 1)
  })

  it('is the jack with one channel, and has not measured the jack with six', () => {
    const tone = sine(4800, 440, 48_000, 0.1)
    const one = framesOf([tone], 48_000).at(-1)!
    expect(one).toMatchObject({ jackMdb: one.levelMdb[0], jackAMdb: one.levelAMdb[0], plugged: null })
    const six = framesOf([tone, tone, tone, tone, tone, tone], 48_000).at(-1)!
    expect(six.levelMdb).toHaveLength(6)
    expect(six).toMatchObject({ jackMdb: NOT_MEASURED_MDB, jackAMdb: NOT_MEASURED_MDB })
    for (const frame of [one, six]) expect(Frame.parse(frame)).toEqual(frame)
  })

  it('calls digital silence silent, also right after a sound', () => {
    const tone = sine(9600, 440, 48_000, 0.5)
    tone.fill(0, 4800)
    const frames = framesOf([tone], 48_000)
    expect(frames.slice(10).map((f) => [f.levelMdb[0], f.levelAMdb[0]])).toEqual(
      Array.from({ length: 10 }, () => [SILENCE_MDB, SILENCE_MDB]),
    )
  })

  it('counts runs of three and more at the end of the scale, across frames, and no shorter ones', () => {
    const fullScale = 32_767 / 32_768
    const samples = new Float64Array(1440)
    samples.fill(fullScale, 100, 102)
    samples.fill(-1, 200, 203)
    samples.fill(fullScale, 478, 485)
    samples[900] = fullScale
    samples[901] = -1
    samples[902] = fullScale
    const frames = framesOf([samples], 48_000, 10, 0, fullScale)
    expect(frames.map((frame) => frame.clipped)).toEqual([3, 7, 0])
  })
})

import path from 'node:path'
import { describe, expect, it } from 'vitest'
import { BenchEvent, BenchHello, Frame } from '../../../src/shared/contract/frames.ts'
import { WavSource } from '../../../simulator/sources/wavSource.ts'
import { writeWav } from '../../../simulator/signal/writeWav.ts'
import { playAll, RECORDING_ORDER } from '../../helpers/recordings.ts'
import { stringTone, sumOf, whiteNoise } from '../../helpers/signals.ts'
import { temporaryFolder } from '../../helpers/temporaryFolder.ts'

const RATE = 48_000

/** 4 s with one pluck of A2 at 2.5 s. */
function plucked(seed: number): Float64Array {
  const tone = new Float64Array(4 * RATE)
  tone.set(stringTone(1.5 * RATE, RATE, { hz: 110 }), 2.5 * RATE)
  return sumOf(tone, whiteNoise(tone.length, 1e-4, seed))
}

const strings = [1, 2, 3, 4, 5, 6, 7, 8].map(plucked)

function file(channels: number, samples = 4 * RATE): string {
  const name = path.join(temporaryFolder(), 'recording.wav')
  const each = strings.slice(0, channels).map((string) => string.subarray(0, samples))
  writeWav(name, each, RATE)
  return name
}

describe('WavSource', () => {
  it('is a one-channel bench with one channel, a six-channel bench with six', () => {
    expect(new WavSource(file(1))).toMatchObject({
      channelKind: 'one',
      capabilities: ['jackLevel', 'noiseA', 'hum', 'pitch'],
      repeatable: true,
      realTime: false,
    })
    expect(new WavSource(file(6), { realTime: true })).toMatchObject({
      channelKind: 'six',
      capabilities: ['sixLevels', 'noiseA', 'hum', 'pitch'],
      realTime: true,
    })
  })

  it('says hello with algorithms that the contract takes', () => {
    const source = new WavSource(file(6), { offsetDb: [-10.125, -9.5, 3.25, -11.125, -12.75, 0.125] })
    const hello = {
      protocolVersion: 1,
      channelKind: source.channelKind,
      frameMs: source.frameMs,
      mainsHz: source.mainsHz,
      capabilities: source.capabilities,
      algorithms: source.algorithms,
      wallClock: '2026-01-02T03:04:05.000Z',
      holding: null,
    }
    expect(BenchHello.parse(hello)).toEqual(hello)
    expect(source.algorithms).toMatchObject({ pitch: 'harmonic-sieve-1', rate: '48000 Hz' })
  })

  it.each([5, 10] as const)(
    'gives frames of %i ms and events that the contract takes, and ends',
    (frameMs) => {
      const source = new WavSource(file(6), { frameMs, mainsHz: 60 })
      const { frames, events } = playAll(source)
      expect(frames).toHaveLength(4000 / frameMs)
      for (const frame of frames) expect(Frame.parse(frame)).toEqual(frame)
      for (const event of events) expect(BenchEvent.parse(event)).toEqual(event)
      expect(new Set(events.map(({ kind }) => kind))).toEqual(new Set(['pitch', 'hum', 'endOfSource']))
      expect(source.next(frames.length)).toBe('ended')
    },
  )

  it('puts every event into the step of the frame that it names', () => {
    const source = new WavSource(file(1))
    source.start(RECORDING_ORDER)
    let events = 0
    for (let frameNo = 0; ; frameNo++) {
      const step = source.next(frameNo)
      if (typeof step === 'string') break
      for (const event of step.events) expect(event.frame).toBe(frameNo)
      events += step.events.length
    }
    expect(events).toBeGreaterThan(2)
  })

  it('gives the same frames when it is asked again, from the middle, and by a new process', () => {
    const name = file(1)
    const all = playAll(new WavSource(name))
    const source = new WavSource(name)
    expect(playAll(source)).toEqual(all)
    source.finish()
    expect(source.next(0)).toBe('notYet')
    source.start({ ...RECORDING_ORDER, from: 270 })
    const from270 = source.next(270)
    expect(from270).toMatchObject({ frame: all.frames[270] })
    expect(source.next(300)).toMatchObject({ frame: all.frames[300] })
    expect(source.next(120)).toMatchObject({ frame: all.frames[120] })
  })

  it('leaves out the rest that is no whole frame', () => {
    expect(playAll(new WavSource(file(1, 48_000 + 479))).frames).toHaveLength(100)
  })

  it('adds an offset of its own to each channel', () => {
    const name = file(6)
    const [plain, offset] = [
      new WavSource(name),
      new WavSource(name, { offsetDb: [1, 2, 3, 4, 5, 6.5] }),
    ].map((source) => playAll(source).frames[200]!.levelMdb)
    expect(offset!.map((level, i) => level - plain![i]!)).toEqual([1000, 2000, 3000, 4000, 5000, 6500])
  })

  it('takes the channels that are named, in their order', () => {
    const name = file(8)
    const all = playAll(new WavSource(name, { useChannels: [8, 7, 6, 5, 4, 3] })).frames[100]!.levelMdb
    const jack = playAll(new WavSource(name, { useChannels: [7] })).frames[100]!
    expect(jack.levelMdb).toEqual([all[1]])
  })

  it.each<[string, () => WavSource, RegExp]>([
    ['two channels', () => new WavSource(file(2)), /has 2 channels.*name the channels/],
    ['a channel that is not there', () => new WavSource(file(1), { useChannels: [2] }), /no channel 2/],
    ['less than a frame', () => new WavSource(file(1, 100)), /shorter than one frame/],
    ['offsets for other channels', () => new WavSource(file(1), { offsetDb: [1, 2] }), /one offset/],
    ['an offset that is no number', () => new WavSource(file(1), { offsetDb: NaN }), /one offset/],
  ])('refuses %s', (_, make, says) => {
    expect(make).toThrow(says)
  })
})

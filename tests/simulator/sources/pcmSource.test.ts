import { PassThrough } from 'node:stream'
import { describe, expect, it } from 'vitest'
import { PcmSource } from '../../../simulator/sources/pcmSource.ts'
import type { PcmOptions } from '../../../simulator/sources/pcmSource.ts'
import { WavSource } from '../../../simulator/sources/wavSource.ts'
import { writeWav } from '../../../simulator/signal/writeWav.ts'
import type { SampleCoding } from '../../../simulator/signal/sampleFormat.ts'
import type { SourceStep } from '../../../simulator/sources/source.ts'
import { playAll, RECORDING_ORDER } from '../../helpers/recordings.ts'
import { sine, stringTone, whiteNoise } from '../../helpers/signals.ts'
import { temporaryFolder } from '../../helpers/temporaryFolder.ts'

const RATE = 48_000
const OPTIONS: PcmOptions = { rateHz: RATE, coding: 's24le', channels: 1, realTime: true }

function bytesOf(samples: Float64Array, coding: SampleCoding): Buffer {
  const size = { s16le: 2, s24le: 3, s32le: 4, f32le: 4, f64le: 8 }[coding]
  const bytes = Buffer.alloc(samples.length * size)
  samples.forEach((x, i) => {
    if (coding === 'f32le') bytes.writeFloatLE(x, i * size)
    else if (coding === 'f64le') bytes.writeDoubleLE(x, i * size)
    else bytes.writeIntLE(Math.round(x * (2 ** (8 * size - 1) - 1)), i * size, size)
  })
  return bytes
}

/** Lets the stream hand over what was written. */
const handedOver = () => new Promise<void>((resolve) => setImmediate(() => setImmediate(resolve)))

function stepsOf(source: PcmSource, from = 0): SourceStep[] {
  const steps: SourceStep[] = []
  for (;;) {
    const step = source.next(from + steps.length)
    if (typeof step === 'string') return steps
    steps.push(step)
  }
}

describe('PcmSource', () => {
  it.each<SampleCoding>(['s16le', 's24le', 's32le', 'f32le', 'f64le'])(
    'reads levels from %s',
    async (coding) => {
      const stream = new PassThrough()
      const source = new PcmSource(stream, { ...OPTIONS, coding })
      source.start(RECORDING_ORDER)
      stream.end(bytesOf(sine(RATE / 2, 1000, RATE, 0.1), coding))
      await handedOver()
      const steps = stepsOf(source)
      expect(steps).toHaveLength(50)
      expect(Math.abs(steps[40]!.frame.jackMdb + 23_010)).toBeLessThan(5)
    },
  )

  it('gives what the same samples give as a file, however the pipe cuts them', async () => {
    const samples = whiteNoise(3 * RATE, 1e-4, 5)
    stringTone(0.5 * RATE, RATE, { hz: 196 }).forEach((x, i) => (samples[2.4 * RATE + i]! += x))
    const name = `${temporaryFolder()}/same.wav`
    writeWav(name, [samples], RATE)
    const wanted = playAll(new WavSource(name))

    const stream = new PassThrough({ highWaterMark: 10_000_000 })
    const source = new PcmSource(stream, OPTIONS)
    source.start(RECORDING_ORDER)
    const bytes = Buffer.alloc(samples.length * 3)
    samples.forEach((x, i) => bytes.writeIntLE(Math.round(x * 0x800000), i * 3, 3))
    for (let at = 0; at < bytes.length; at += 7001) stream.write(bytes.subarray(at, at + 7001))
    stream.end()
    await handedOver()
    const steps = stepsOf(source)
    expect(steps.map(({ frame }) => frame)).toEqual(wanted.frames)
    expect(steps.flatMap(({ events }) => events)).toEqual(wanted.events)
    expect(source.next(steps.length)).toBe('ended')
  })

  it('lets go in real time what comes between two runs, and keeps step with the blocks', async () => {
    const stream = new PassThrough()
    const source = new PcmSource(stream, { ...OPTIONS, coding: 's16le' })
    const loud = bytesOf(sine(RATE, 1000, RATE, 0.9), 's16le')
    stream.write(loud.subarray(0, loud.length - 1))
    await handedOver()
    expect(source.next(0)).toBe('notYet')
    source.start({ ...RECORDING_ORDER, from: 0 })
    stream.write(loud.subarray(loud.length - 1))
    stream.end(bytesOf(sine(RATE / 10, 1000, RATE, 0.001), 's16le'))
    await handedOver()
    const levels = stepsOf(source).map(({ frame }) => frame.jackMdb)
    expect(levels).toHaveLength(10)
    for (const level of levels.slice(1)) expect(Math.abs(level + 63_010)).toBeLessThan(100)
  })

  it('holds the stream until a run begins when it is not in real time', async () => {
    const stream = new PassThrough()
    const source = new PcmSource(stream, { ...OPTIONS, realTime: false })
    stream.end(bytesOf(sine(RATE / 10, 1000, RATE, 0.1), 's24le'))
    await handedOver()
    source.start(RECORDING_ORDER)
    await handedOver()
    expect(stepsOf(source)).toHaveLength(10)
  })

  it('holds one frame back, so that the last one carries the end', async () => {
    const stream = new PassThrough()
    const source = new PcmSource(stream, OPTIONS)
    source.start(RECORDING_ORDER)
    stream.write(bytesOf(sine(960, 1000, RATE, 0.1), 's24le'))
    await handedOver()
    expect(stepsOf(source)).toHaveLength(1)
    stream.end()
    await handedOver()
    const last = stepsOf(source, 1)
    expect(last).toHaveLength(1)
    expect(last[0]!.events).toMatchObject([{ kind: 'endOfSource', frame: 1 }])
    expect(source.next(2)).toBe('ended')
  })

  it('counts frames from the one that the server wants after a restart', async () => {
    const stream = new PassThrough()
    const source = new PcmSource(stream, OPTIONS)
    source.start({ ...RECORDING_ORDER, from: 500 })
    const samples = whiteNoise(RATE, 1e-4, 5)
    stringTone(0.5 * RATE, RATE, { hz: 196 }).forEach((x, i) => (samples[RATE / 2 + i]! += x))
    stream.end(bytesOf(samples, 's24le'))
    await handedOver()
    const pitch = stepsOf(source, 500)
      .flatMap(({ events }) => events)
      .find(({ kind }) => kind === 'pitch')
    expect(pitch).toMatchObject({ startTenthMs: 5500 * 10 + 400, frame: 575 })
  })

  it.each<[string, Partial<PcmOptions>, RegExp]>([
    ['a rate that cannot carry 20 kHz', { rateHz: 16_000 }, /16000 Hz/],
    ['no channels', { channels: 0 }, /number of channels is 0/],
    ['two channels', { channels: 2 }, /has 2 channels/],
  ])('refuses %s', (_, options, says) => {
    expect(() => new PcmSource(new PassThrough(), { ...OPTIONS, ...options })).toThrow(says)
  })
})

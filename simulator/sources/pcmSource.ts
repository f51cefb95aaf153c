import type { Readable } from 'node:stream'
import type { RunOrder } from '../../src/shared/contract/frames.ts'
import { frameStart } from '../signal/frameAnalyser.ts'
import { blockBytes, decodeBlocks, fullScaleOf, plainFormat } from '../signal/sampleFormat.ts'
import type { SampleCoding, SampleFormat } from '../signal/sampleFormat.ts'
import { SignalAnalyser } from '../signal/signalAnalyser.ts'
import { endOfSource } from './wavSource.ts'
import { recordedSignal } from './recordedSignal.ts'
import type { RecordedSignal, RecordedSignalOptions } from './recordedSignal.ts'
import type { BenchSource, SourceStep } from './source.ts'

export interface PcmOptions extends RecordedSignalOptions {
  rateHz: number
  coding: SampleCoding
  channels: number
}

/** Frames that wait while the server is away; then the stream is held, and it is the recorder that must wait. */
const MOST_WAITING_MS = 30 * 60 * 1000

/**
 * Raw samples from a pipe as a bench. In real time (a recorder at an input) what comes between two runs is let go;
 * otherwise (a file through a pipe) the stream is held until a run asks for it.
 */
export class PcmSource implements BenchSource {
  readonly realTime: boolean
  readonly repeatable = false
  private readonly stream: Readable
  private readonly format: SampleFormat
  private readonly signal: RecordedSignal
  private readonly buffers: Float64Array[]
  private analyser: SignalAnalyser | null = null
  private run: string | null = null
  private pending: Buffer = Buffer.alloc(0)
  private waiting: { frameNo: number; step: SourceStep }[] = []
  private frameNo = 0
  private ended = false

  constructor(stream: Readable, options: PcmOptions) {
    this.stream = stream
    this.realTime = options.realTime ?? true
    this.format = plainFormat(options.coding, options.channels, options.rateHz)
    this.signal = recordedSignal('pcm-stream-1', options.channels, options.rateHz, options)
    const longest = Math.ceil((this.signal.frameMs * options.rateHz) / 1000)
    this.buffers = Array.from({ length: options.channels }, () => new Float64Array(longest))
    stream.on('data', (bytes: Buffer) => this.take(bytes))
    stream.on('end', () => this.end())
    stream.on('error', () => this.end())
    if (!this.realTime) stream.pause()
  }

  get channelKind() {
    return this.signal.channelKind
  }
  get frameMs() {
    return this.signal.frameMs
  }
  get mainsHz() {
    return this.signal.mainsHz
  }
  get capabilities() {
    return this.signal.capabilities
  }
  get algorithms() {
    return this.signal.algorithms
  }

  start(order: RunOrder): void {
    if (this.run === order.run) return
    this.run = order.run
    this.frameNo = order.from
    this.waiting = []
    // a block may be cut by the pipe: what is left of it belongs to the next one
    this.pending = this.pending.subarray(0, this.pending.length % blockBytes(this.format))
    const { offsetDb, frameMs, mainsHz } = this.signal
    this.analyser = new SignalAnalyser({
      rateHz: this.format.rateHz,
      fullScale: fullScaleOf(this.format),
      offsetDb,
      frameMs,
      mainsHz,
      noiseStretchMs: order.noiseStretchMs,
      expectedHz: order.expectedHz,
      firstFrame: order.from,
    })
    this.stream.resume()
  }

  prompt(): void {
    // whoever plays to the recorder reads the prompt on the screen
  }

  next(frameNo: number): SourceStep | 'notYet' | 'ended' {
    while (this.waiting.length > 0 && this.waiting[0]!.frameNo < frameNo) this.waiting.shift()
    const first = this.waiting[0]
    // one frame is held back, so that the last one can carry the end
    if (first?.frameNo === frameNo && (this.waiting.length > 1 || this.ended)) {
      this.waiting.shift()
      if (this.stream.isPaused() && this.run) this.stream.resume()
      return first.step
    }
    return this.ended && this.waiting.length === 0 ? 'ended' : 'notYet'
  }

  finish(): void {
    this.run = null
    this.analyser = null
    this.waiting = []
    if (!this.realTime) this.stream.pause()
  }

  close(): Promise<void> {
    this.stream.destroy()
    return Promise.resolve()
  }

  private take(bytes: Buffer): void {
    this.pending = this.pending.length === 0 ? bytes : Buffer.concat([this.pending, bytes])
    const block = blockBytes(this.format)
    if (!this.analyser) {
      if (this.realTime) this.pending = this.pending.subarray(Math.floor(this.pending.length / block) * block)
      return
    }
    const { frameMs, channels } = this.signal
    const { rateHz } = this.format
    for (;;) {
      const count = frameStart(this.frameNo + 1, frameMs, rateHz) - frameStart(this.frameNo, frameMs, rateHz)
      if (this.pending.length < count * block) break
      decodeBlocks(this.format, this.pending, count, this.buffers)
      this.pending = this.pending.subarray(count * block)
      const step = this.analyser.next(
        channels.map((channel) => this.buffers[channel]!),
        count,
      )
      this.waiting.push({ frameNo: this.frameNo++, step })
    }
    if (this.waiting.length * frameMs > MOST_WAITING_MS) this.stream.pause()
  }

  private end(): void {
    if (this.ended) return
    this.ended = true
    const last = this.waiting.at(-1)
    if (last)
      last.step = {
        frame: last.step.frame,
        events: [...last.step.events, endOfSource(last.frameNo, this.signal.frameMs)],
      }
  }
}

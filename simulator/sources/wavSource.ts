import type { BenchEvent, BenchVerify, RunOrder } from '../../src/shared/contract/frames.ts'
import { frameStart } from '../signal/frameAnalyser.ts'
import { RecordingError } from '../signal/recordingError.ts'
import { fullScaleOf } from '../signal/sampleFormat.ts'
import { SignalAnalyser } from '../signal/signalAnalyser.ts'
import { WavFile } from '../signal/wav.ts'
import { recordedSignal } from './recordedSignal.ts'
import type { RecordedSignal, RecordedSignalOptions } from './recordedSignal.ts'
import type { BenchSource, SourceStep } from './source.ts'
import { verifyAnalysis } from './verifyAnalysis.ts'

/** A recording as a bench: every run reads it from its first sample, and the same frame is the same each time. */
export class WavSource implements BenchSource {
  readonly realTime: boolean
  readonly repeatable = true
  private readonly file: WavFile
  private readonly signal: RecordedSignal
  private readonly buffers: Float64Array[]
  private order: RunOrder | null = null
  private analyser: SignalAnalyser | null = null
  private position = 0

  constructor(path: string, options: RecordedSignalOptions = {}) {
    this.realTime = options.realTime ?? false
    this.file = new WavFile(path)
    try {
      const { format, samples } = this.file.header
      this.signal = recordedSignal('wav-file-1', format.channels, format.rateHz, options)
      const longest = Math.ceil((this.signal.frameMs * format.rateHz) / 1000)
      if (samples < longest) throw new RecordingError('The recording is shorter than one frame.')
      this.buffers = Array.from({ length: format.channels }, () => new Float64Array(longest))
    } catch (error) {
      this.file.close()
      throw error
    }
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

  /** Bytes that the file's header promises and the file does not hold. */
  get missingBytes(): number {
    return this.file.header.missingBytes
  }

  start(order: RunOrder): void {
    if (this.order?.run !== order.run) this.analyser = null
    this.order = order
  }

  prompt(): void {
    // a recording goes on as it was played
  }

  next(frameNo: number): SourceStep | 'notYet' | 'ended' {
    if (!this.order) return 'notYet'
    if (!this.analyser || frameNo < this.position) this.toBeginning(this.order)
    for (;;) {
      const step = this.step(this.analyser!)
      if (!step || this.position > frameNo) return step ?? 'ended'
    }
  }

  verifySelf(): BenchVerify {
    return verifyAnalysis(this.frameSettings())
  }

  finish(): void {
    this.order = null
    this.analyser = null
  }

  close(): Promise<void> {
    this.file.close()
    return Promise.resolve()
  }

  private toBeginning(order: RunOrder): void {
    this.file.rewind()
    this.position = 0
    this.analyser = new SignalAnalyser({
      ...this.frameSettings(),
      mainsHz: this.signal.mainsHz,
      noiseStretchMs: order.noiseStretchMs,
      expectedHz: order.expectedHz,
    })
  }

  private frameSettings() {
    const { format } = this.file.header
    const { offsetDb, frameMs } = this.signal
    return { rateHz: format.rateHz, fullScale: fullScaleOf(format), offsetDb, frameMs }
  }

  private samplesOf(frameNo: number): number {
    const { frameMs } = this.signal
    const { rateHz } = this.file.header.format
    return frameStart(frameNo + 1, frameMs, rateHz) - frameStart(frameNo, frameMs, rateHz)
  }

  private step(analyser: SignalAnalyser): SourceStep | null {
    const frameNo = this.position
    const count = this.samplesOf(frameNo)
    if (!this.file.read(count, this.buffers)) return null
    this.position++
    const { frame, events } = analyser.next(
      this.signal.channels.map((channel) => this.buffers[channel]!),
      count,
    )
    const last = this.file.remaining < this.samplesOf(frameNo + 1)
    return { frame, events: last ? [...events, endOfSource(frameNo, this.signal.frameMs)] : events }
  }
}

export function endOfSource(frameNo: number, frameMs: number): BenchEvent {
  return {
    kind: 'endOfSource',
    frame: frameNo,
    startTenthMs: (frameNo + 1) * frameMs * 10,
    durationTenthMs: 0,
  }
}

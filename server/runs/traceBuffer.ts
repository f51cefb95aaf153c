import type { BenchEvent, Frame } from '../../src/shared/contract/frames.ts'
import { packSegment, readRow, rowWidth, sha256Of, writeRow } from './traceSegment.ts'
import type { StoredSegment, TraceStretch } from './traceSegment.ts'

/** Frames that were received and are not committed yet, as whole numbers: about 100 bytes a frame. */
export class TraceBuffer {
  readonly channels: number
  private rows: Int32Array
  private count = 0
  private events: BenchEvent[] = []

  constructor(channels: number) {
    this.channels = channels
    this.rows = new Int32Array(rowWidth(channels) * 1024)
  }

  get frames(): number {
    return this.count
  }

  append(frame: Frame, events: readonly BenchEvent[]): void {
    const width = rowWidth(this.channels)
    if ((this.count + 1) * width > this.rows.length) {
      const larger = new Int32Array(this.rows.length * 2)
      larger.set(this.rows)
      this.rows = larger
    }
    writeRow(this.rows, this.count * width, frame)
    this.count++
    for (const event of events) this.events.push(event)
  }

  /** The first `frames` of them as a segment to store; they stay here until `drop`. */
  pack(no: number, fromFrame: number, frames: number): StoredSegment {
    const events = this.events.filter((event) => event.frame < fromFrame + frames)
    const data = packSegment(this.rows, frames, this.channels, events)
    return { no, fromFrame, frames, sha256: sha256Of(data), data }
  }

  /** Forgets the first `frames`, which are safe; `toFrame` is the number of the first frame that stays. */
  drop(frames: number, toFrame: number): void {
    const width = rowWidth(this.channels)
    this.rows.copyWithin(0, frames * width, this.count * width)
    this.count -= frames
    this.events = this.events.filter((event) => event.frame >= toFrame)
  }

  read(): TraceStretch {
    const width = rowWidth(this.channels)
    const frames: Frame[] = []
    for (let f = 0; f < this.count; f++) frames.push(readRow(this.rows, f * width, this.channels))
    return { frames, events: [...this.events] }
  }
}

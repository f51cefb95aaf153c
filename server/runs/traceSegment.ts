import { createHash } from 'node:crypto'
import { deflateSync, inflateSync } from 'node:zlib'
import { BenchEvent } from '../../src/shared/contract/frames.ts'
import type { Frame } from '../../src/shared/contract/frames.ts'
import { z } from 'zod'

/**
 * A stretch of a run's trace as it is stored. Layout, all little-endian:
 * 'EVT1', uint32 length of the head, head (JSON: channels, frames, events), then deflated columns: each value of a
 * frame is one column of whole numbers, kept as the difference to the frame before, zigzag, seven bits a byte.
 */
const MAGIC = 'EVT1'
const NOT_MEASURED = -2_147_483_648

const Head = z.object({
  channels: z.int().min(1).max(6),
  frames: z.int().min(0),
  events: z.array(BenchEvent),
})

export interface TraceStretch {
  frames: Frame[]
  events: BenchEvent[]
}

export interface StoredSegment {
  no: number
  fromFrame: number
  frames: number
  sha256: Buffer
  data: Buffer
}

/** Whole numbers of one frame, in the order of the columns. */
export function rowWidth(channels: number): number {
  return 2 * channels + 8
}

export function writeRow(row: Int32Array, at: number, frame: Frame): void {
  let i = at
  for (const mdb of frame.levelMdb) row[i++] = mdb
  for (const mdb of frame.levelAMdb) row[i++] = mdb
  row[i++] = frame.jackMdb
  row[i++] = frame.jackAMdb
  row[i++] = frame.clipped
  row[i++] = fromTri(frame.plugged)
  row[i++] = fromTri(frame.ringSleeveClosed)
  row[i++] = fromTri(frame.tipClosed)
  row[i++] = frame.currentUa ?? NOT_MEASURED
  row[i] = frame.batteryMv ?? NOT_MEASURED
}

export function readRow(rows: Int32Array, at: number, channels: number): Frame {
  const tail = at + 2 * channels
  const current = rows[tail + 6]!
  const battery = rows[tail + 7]!
  return {
    levelMdb: Array.from(rows.subarray(at, at + channels)),
    levelAMdb: Array.from(rows.subarray(at + channels, tail)),
    jackMdb: rows[tail]!,
    jackAMdb: rows[tail + 1]!,
    clipped: rows[tail + 2]!,
    plugged: toTri(rows[tail + 3]!),
    ringSleeveClosed: toTri(rows[tail + 4]!),
    tipClosed: toTri(rows[tail + 5]!),
    currentUa: current === NOT_MEASURED ? null : current,
    batteryMv: battery === NOT_MEASURED ? null : battery,
  }
}

/** Packs `frames` rows; equal input gives equal bytes, so that the hash is stable. */
export function packSegment(
  rows: Int32Array,
  frames: number,
  channels: number,
  events: readonly BenchEvent[],
): Buffer {
  const width = rowWidth(channels)
  const head = Buffer.from(JSON.stringify({ channels, frames, events }), 'utf8')
  const body = Buffer.allocUnsafe(frames * width * 5)
  let at = 0
  for (let column = 0; column < width; column++) {
    let before = 0
    for (let f = 0; f < frames; f++) {
      const value = rows[f * width + column]!
      const difference = value - before
      before = value
      let zigzag = difference >= 0 ? difference * 2 : -difference * 2 - 1
      while (zigzag >= 128) {
        body[at++] = (zigzag % 128) | 128
        zigzag = Math.floor(zigzag / 128)
      }
      body[at++] = zigzag
    }
  }
  const lengths = Buffer.alloc(4)
  lengths.writeUInt32LE(head.length)
  return Buffer.concat([
    Buffer.from(MAGIC, 'latin1'),
    lengths,
    head,
    deflateSync(body.subarray(0, at), { level: 6 }),
  ])
}

export function sha256Of(data: Buffer): Buffer {
  return createHash('sha256').update(data).digest()
}

/** Unpacks a stored segment; throws when its bytes are not those that were hashed. */
export function unpackSegment(segment: StoredSegment): TraceStretch {
  if (!sha256Of(segment.data).equals(segment.sha256))
    throw new Error(
      `segment ${segment.no} does not match its SHA-256: its bytes were changed after it was stored`,
    )
  if (segment.data.toString('latin1', 0, 4) !== MAGIC)
    throw new Error(`segment ${segment.no} has an unknown layout`)
  const headLength = segment.data.readUInt32LE(4)
  const head = Head.parse(JSON.parse(segment.data.toString('utf8', 8, 8 + headLength)))
  const body = inflateSync(segment.data.subarray(8 + headLength))
  const width = rowWidth(head.channels)
  const rows = new Int32Array(head.frames * width)
  let at = 0
  for (let column = 0; column < width; column++) {
    let value = 0
    for (let f = 0; f < head.frames; f++) {
      let zigzag = 0
      let scale = 1
      let byte = body[at++]!
      while (byte >= 128) {
        zigzag += (byte - 128) * scale
        scale *= 128
        byte = body[at++]!
      }
      zigzag += byte * scale
      value += zigzag % 2 === 0 ? zigzag / 2 : -(zigzag + 1) / 2
      rows[f * width + column] = value
    }
  }
  const frames: Frame[] = []
  for (let f = 0; f < head.frames; f++) frames.push(readRow(rows, f * width, head.channels))
  return { frames, events: head.events }
}

/** The whole trace of a run; throws when a segment is missing or its bytes were changed. */
export function unpackTrace(segments: readonly StoredSegment[]): TraceStretch {
  const trace: TraceStretch = { frames: [], events: [] }
  for (const segment of segments) {
    if (segment.fromFrame !== trace.frames.length)
      throw new Error(
        `the trace has no frame ${trace.frames.length}: a segment before number ${segment.no} is missing`,
      )
    const stretch = unpackSegment(segment)
    for (const frame of stretch.frames) trace.frames.push(frame)
    for (const event of stretch.events) trace.events.push(event)
  }
  return trace
}

function fromTri(state: boolean | null): number {
  return state === null ? 2 : state ? 1 : 0
}

function toTri(value: number): boolean | null {
  return value === 2 ? null : value === 1
}

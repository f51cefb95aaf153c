import { closeSync, fstatSync, openSync, readSync } from 'node:fs'
import { RecordingError } from './recordingError.ts'
import { blockBytes, checkRate, decodeBlocks, MOST_CHANNELS } from './sampleFormat.ts'
import type { SampleCoding, SampleFormat } from './sampleFormat.ts'

const PCM = 1
const IEEE_FLOAT = 3
const EXTENSIBLE = 0xfffe
const FORMAT_NAMES: Record<number, string> = { 2: 'ADPCM', 6: 'A-law', 7: 'mu-law', 0x55: 'MPEG layer 3' }
/** The tail that makes a 16 bit format tag a GUID: xxxxxxxx-0000-0010-8000-00AA00389B71. */
const GUID_TAIL = '000000001000800000aa00389b71'
/** A writer that cannot seek back leaves one of these where the size should be. */
const UNKNOWN_SIZES: readonly number[] = [0, 0xffffffff]
const PIECE_BYTES = 1 << 18

export interface WavHeader {
  format: SampleFormat
  /** where the samples begin in the file, bytes */
  dataAt: number
  /** bytes of whole blocks that are there to be read */
  dataBytes: number
  /** samples of each channel */
  samples: number
  /** the header promises this many bytes more than the file holds (a recording that was cut off) */
  missingBytes: number
}

/** Reads bytes at a place; shorter than asked at the end of the file. */
export type ReadAt = (position: number, length: number) => Buffer

/** Finds format and samples of a RIFF/WAVE or RF64 file; refuses what it cannot read, by name. */
export function readWavHeader(readAt: ReadAt, fileBytes: number): WavHeader {
  const riff = readAt(0, 12)
  if (riff.length < 12) throw new RecordingError('The file is shorter than a WAV header.')
  const magic = riff.toString('latin1', 0, 4)
  if (magic === 'RIFX')
    throw new RecordingError('The file is big-endian (RIFX). Save it as little-endian WAV.')
  if ((magic !== 'RIFF' && magic !== 'RF64') || riff.toString('latin1', 8, 12) !== 'WAVE')
    throw new RecordingError('The file is not a WAV file: it does not begin with RIFF and WAVE.')

  let format: SampleFormat | null = null
  let largeDataBytes: number | null = null
  for (let at = 12; at + 8 <= fileBytes;) {
    const head = readAt(at, 8)
    const id = head.toString('latin1', 0, 4)
    const size = head.readUInt32LE(4)
    if (id === 'fmt ') format = readFormat(readAt(at + 8, Math.min(size, 64)), size)
    if (id === 'ds64') largeDataBytes = Number(readAt(at + 8, 16).readBigUInt64LE(8))
    if (id === 'data') {
      if (!format)
        throw new RecordingError('The samples come before their format (no fmt chunk before data).')
      const promised = size === 0xffffffff && largeDataBytes !== null ? largeDataBytes : size
      return placeOfSamples(format, at + 8, promised, fileBytes)
    }
    at += 8 + size + (size % 2)
  }
  throw new RecordingError(
    format ? 'The file holds no samples (no data chunk).' : 'The file holds no sound format (no fmt chunk).',
  )
}

function placeOfSamples(
  format: SampleFormat,
  dataAt: number,
  promised: number,
  fileBytes: number,
): WavHeader {
  const there = fileBytes - dataAt
  const wanted = UNKNOWN_SIZES.includes(promised) ? there : promised
  const block = blockBytes(format)
  const samples = Math.floor(Math.min(wanted, there) / block)
  if (samples === 0) throw new RecordingError('The file holds no samples: its data chunk is empty.')
  return { format, dataAt, dataBytes: samples * block, samples, missingBytes: Math.max(0, wanted - there) }
}

function readFormat(fmt: Buffer, size: number): SampleFormat {
  if (size < 16 || fmt.length < 16) throw new RecordingError(`The fmt chunk has ${size} bytes; it needs 16.`)
  let tag = fmt.readUInt16LE(0)
  const channels = fmt.readUInt16LE(2)
  const rateHz = fmt.readUInt32LE(4)
  const blockAlign = fmt.readUInt16LE(12)
  const bits = fmt.readUInt16LE(14)
  let validBits = bits
  if (tag === EXTENSIBLE) {
    if (fmt.length < 40 || fmt.readUInt16LE(16) < 22)
      throw new RecordingError('The extensible format is cut short: its extension needs 22 bytes.')
    validBits = fmt.readUInt16LE(18) || bits
    if (fmt.toString('hex', 26, 40) !== GUID_TAIL)
      throw new RecordingError(`The sub-format ${fmt.toString('hex', 24, 40)} is not known.`)
    tag = fmt.readUInt16LE(24)
  }
  if (tag !== PCM && tag !== IEEE_FLOAT)
    throw new RecordingError(
      `The samples are coded as ${FORMAT_NAMES[tag] ?? `format ${tag}`}. Save them as PCM or float.`,
    )
  if (channels < 1 || channels > MOST_CHANNELS)
    throw new RecordingError(
      `The file says that it has ${channels} channels; 1 to ${MOST_CHANNELS} can be read.`,
    )
  checkRate(rateHz)
  const coding = codingOf(tag, bits)
  if (validBits > bits || validBits < 8)
    throw new RecordingError(`The file says that ${validBits} of ${bits} bits are valid; that cannot be.`)
  if (blockAlign !== (channels * bits) / 8)
    throw new RecordingError(
      `The block size is ${blockAlign} bytes, but ${channels} channels of ${bits} bits make ${(channels * bits) / 8}.`,
    )
  return { coding, channels, rateHz, validBits }
}

function codingOf(tag: number, bits: number): SampleCoding {
  if (tag === PCM && bits === 16) return 's16le'
  if (tag === PCM && bits === 24) return 's24le'
  if (tag === PCM && bits === 32) return 's32le'
  if (tag === IEEE_FLOAT && bits === 32) return 'f32le'
  if (tag === IEEE_FLOAT && bits === 64) return 'f64le'
  const kind = tag === PCM ? 'whole numbers' : 'float'
  throw new RecordingError(
    `The samples are ${kind} of ${bits} bits. Save them with 16, 24 or 32 bits, or as 32 or 64 bit float.`,
  )
}

/** A WAV file, read from front to back in pieces, so that its size does not matter. */
export class WavFile {
  readonly header: WavHeader
  private readonly file: number
  private readonly piece: Buffer
  private pieceFrom = 0
  private pieceBlocks = 0
  private position = 0
  private closed = false

  constructor(path: string) {
    this.file = openFile(path)
    try {
      this.header = readWavHeader((at, length) => this.readAt(at, length), fstatSync(this.file).size)
    } catch (error) {
      closeSync(this.file)
      throw error
    }
    const block = blockBytes(this.header.format)
    this.piece = Buffer.alloc(Math.max(1, Math.floor(PIECE_BYTES / block)) * block)
  }

  /** Samples of each channel that are still to be read. */
  get remaining(): number {
    return this.header.samples - this.position
  }

  /** Back to the first sample. */
  rewind(): void {
    this.position = 0
  }

  /** Reads `count` samples of each channel into the arrays; false, and nothing read, if fewer are left. */
  read(count: number, into: readonly Float64Array[]): boolean {
    if (count > this.remaining) return false
    const block = blockBytes(this.header.format)
    for (let done = 0; done < count;) {
      if (this.position < this.pieceFrom || this.position >= this.pieceFrom + this.pieceBlocks) this.fill()
      const offset = this.position - this.pieceFrom
      const take = Math.min(count - done, this.pieceBlocks - offset)
      decodeBlocks(this.header.format, this.piece.subarray(offset * block), take, into, done)
      this.position += take
      done += take
    }
    return true
  }

  close(): void {
    if (this.closed) return
    this.closed = true
    closeSync(this.file)
  }

  private fill(): void {
    const block = blockBytes(this.header.format)
    const left = (this.header.samples - this.position) * block
    const bytes = this.readAt(this.header.dataAt + this.position * block, Math.min(left, this.piece.length))
    if (bytes.length < block) throw new RecordingError('The file became shorter while it was read.')
    bytes.copy(this.piece)
    this.pieceFrom = this.position
    this.pieceBlocks = Math.floor(bytes.length / block)
  }

  private readAt(position: number, length: number): Buffer {
    const bytes = Buffer.alloc(length)
    let done = 0
    while (done < length) {
      const got = readSync(this.file, bytes, done, length - done, position + done)
      if (got === 0) break
      done += got
    }
    return bytes.subarray(0, done)
  }
}

function openFile(path: string): number {
  try {
    return openSync(path, 'r')
  } catch (error) {
    throw new RecordingError(`The file ${path} cannot be opened: ${(error as NodeJS.ErrnoException).code}.`)
  }
}

import { RecordingError } from './recordingError.ts'

/** How one sample stands in bytes, little-endian. */
export type SampleCoding = 's16le' | 's24le' | 's32le' | 'f32le' | 'f64le'
export const SAMPLE_CODINGS: readonly SampleCoding[] = ['s16le', 's24le', 's32le', 'f32le', 'f64le']

const BYTES: Record<SampleCoding, number> = { s16le: 2, s24le: 3, s32le: 4, f32le: 4, f64le: 8 }

export interface SampleFormat {
  coding: SampleCoding
  channels: number
  rateHz: number
  /** bits that carry the sample; fewer than the container's in some WAVE_FORMAT_EXTENSIBLE files */
  validBits: number
}

/** The frames' band reaches 20 kHz, which a lower rate cannot carry. */
export const LOWEST_RATE_HZ = 44_100
export const HIGHEST_RATE_HZ = 192_000
export const MOST_CHANNELS = 64

export function bytesPerSample(coding: SampleCoding): number {
  return BYTES[coding]
}

/** Bytes of one sample of every channel. */
export function blockBytes(format: SampleFormat): number {
  return BYTES[format.coding] * format.channels
}

/** The largest magnitude that the coding can hold, as a part of full scale (1). */
export function fullScaleOf(format: SampleFormat): number {
  if (format.coding === 'f32le' || format.coding === 'f64le') return 1
  return 1 - 2 ** (1 - format.validBits)
}

export function checkRate(rateHz: number): void {
  if (rateHz >= LOWEST_RATE_HZ && rateHz <= HIGHEST_RATE_HZ) return
  throw new RecordingError(
    `The sample rate is ${rateHz} Hz. Levels are measured from 20 Hz to 20 kHz, so record with ` +
      `${LOWEST_RATE_HZ} to ${HIGHEST_RATE_HZ} Hz.`,
  )
}

export function plainFormat(coding: SampleCoding, channels: number, rateHz: number): SampleFormat {
  checkRate(rateHz)
  if (!Number.isInteger(channels) || channels < 1 || channels > MOST_CHANNELS)
    throw new RecordingError(`The number of channels is ${channels}. Use 1 to ${MOST_CHANNELS}.`)
  return { coding, channels, rateHz, validBits: BYTES[coding] * 8 }
}

/**
 * Interleaved bytes to one array a channel, full scale = 1. `count` blocks from the start of `bytes` are read into
 * `into[channel][at...]`. A float that is not finite becomes full scale, so that it counts as clipped and not as a
 * level.
 */
export function decodeBlocks(
  format: SampleFormat,
  bytes: Buffer,
  count: number,
  into: readonly Float64Array[],
  at = 0,
): void {
  const { channels, coding } = format
  const size = BYTES[coding]
  const stride = size * channels
  const read = READERS[coding]
  for (let channel = 0; channel < channels; channel++)
    read(bytes, channel * size, stride, count, into[channel]!, at)
}

type Reader = (b: Buffer, from: number, stride: number, count: number, into: Float64Array, at: number) => void

const READERS: Record<SampleCoding, Reader> = {
  s16le(b, from, stride, count, into, at) {
    for (let i = 0, p = from; i < count; i++, p += stride)
      into[at + i] = (((b[p]! | (b[p + 1]! << 8)) << 16) >> 16) / 0x8000
  },
  s24le(b, from, stride, count, into, at) {
    for (let i = 0, p = from; i < count; i++, p += stride)
      into[at + i] = (((b[p]! << 8) | (b[p + 1]! << 16) | (b[p + 2]! << 24)) >> 8) / 0x800000
  },
  s32le(b, from, stride, count, into, at) {
    for (let i = 0, p = from; i < count; i++, p += stride)
      into[at + i] = (b[p]! | (b[p + 1]! << 8) | (b[p + 2]! << 16) | (b[p + 3]! << 24)) / 0x80000000
  },
  f32le(b, from, stride, count, into, at) {
    const view = new DataView(b.buffer, b.byteOffset, b.byteLength)
    for (let i = 0, p = from; i < count; i++, p += stride) into[at + i] = finite(view.getFloat32(p, true))
  },
  f64le(b, from, stride, count, into, at) {
    const view = new DataView(b.buffer, b.byteOffset, b.byteLength)
    for (let i = 0, p = from; i < count; i++, p += stride) into[at + i] = finite(view.getFloat64(p, true))
  },
}

function finite(value: number): number {
  if (Number.isFinite(value)) return value
  return value === -Infinity ? -1 : 1
}

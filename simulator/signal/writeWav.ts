import { writeFileSync } from 'node:fs'

const HEADER_BYTES = 68
const SCALE = 0x800000

/**
 * Writes samples (one array a channel, full scale = 1) as 24 bit WAVE_FORMAT_EXTENSIBLE. What does not fit is
 * clipped, as a converter would.
 */
export function writeWav(path: string, channels: readonly Float64Array[], rateHz: number): void {
  const count = channels[0]!.length
  const block = channels.length * 3
  const bytes = Buffer.alloc(HEADER_BYTES + count * block + ((count * block) % 2))
  writeHeader(bytes, channels.length, rateHz, count * block)
  channels.forEach((samples, channel) => {
    for (let i = 0, at = HEADER_BYTES + channel * 3; i < count; i++, at += block) {
      const code = Math.max(-SCALE, Math.min(SCALE - 1, Math.round(samples[i]! * SCALE)))
      bytes[at] = code & 0xff
      bytes[at + 1] = (code >> 8) & 0xff
      bytes[at + 2] = (code >> 16) & 0xff
    }
  })
  writeFileSync(path, bytes)
}

function writeHeader(bytes: Buffer, channels: number, rateHz: number, dataBytes: number): void {
  bytes.write('RIFF', 0, 'latin1')
  bytes.writeUInt32LE(bytes.length - 8, 4)
  bytes.write('WAVEfmt ', 8, 'latin1')
  bytes.writeUInt32LE(40, 16)
  bytes.writeUInt16LE(0xfffe, 20)
  bytes.writeUInt16LE(channels, 22)
  bytes.writeUInt32LE(rateHz, 24)
  bytes.writeUInt32LE(rateHz * channels * 3, 28)
  bytes.writeUInt16LE(channels * 3, 32)
  bytes.writeUInt16LE(24, 34)
  bytes.writeUInt16LE(22, 36)
  bytes.writeUInt16LE(24, 38)
  bytes.writeUInt32LE(0, 40)
  bytes.write('0100000000001000800000aa00389b71', 44, 'hex')
  bytes.write('data', 60, 'latin1')
  bytes.writeUInt32LE(dataBytes, 64)
}

import { execFileSync } from 'node:child_process'
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import path from 'node:path'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { readWavHeader, WavFile } from '../../../simulator/signal/wav.ts'
import { writeWav } from '../../../simulator/signal/writeWav.ts'
import { sine } from '../../helpers/signals.ts'
import { projectDir } from '../../helpers/sources.ts'

/** Facts of the format with their published sources: tests/reference/wav.json. */
const reference = JSON.parse(readFileSync(path.join(projectDir, 'tests/reference/wav.json'), 'utf8')) as {
  values: { id: string; value: unknown; bytes_in_file_order?: string; full_scale_fraction?: number }[]
}
const factOf = (id: string) => reference.values.find((fact) => fact.id === id)!

let folder: string
beforeAll(() => {
  folder = mkdtempSync(path.join(tmpdir(), 'wav-'))
})
afterAll(() => rmSync(folder, { recursive: true }))

interface Fmt {
  tag: number
  channels?: number
  rateHz?: number
  bits: number
  blockAlign?: number
  extension?: Buffer
}

function fmtChunk({ tag, channels = 1, rateHz = 48_000, bits, blockAlign, extension }: Fmt): Buffer {
  const fmt = Buffer.alloc(16)
  const block = blockAlign ?? (channels * bits) / 8
  fmt.writeUInt16LE(tag, 0)
  fmt.writeUInt16LE(channels, 2)
  fmt.writeUInt32LE(rateHz, 4)
  fmt.writeUInt32LE(rateHz * block, 8)
  fmt.writeUInt16LE(block, 12)
  fmt.writeUInt16LE(bits, 14)
  return extension ? Buffer.concat([fmt, extension]) : fmt
}

function chunk(id: string, body: Buffer, size = body.length): Buffer {
  const head = Buffer.alloc(8)
  head.write(id, 'latin1')
  head.writeUInt32LE(size, 4)
  return Buffer.concat([head, body, Buffer.alloc(body.length % 2)])
}

function wav(chunks: Buffer[], magic = 'RIFF'): Buffer {
  const body = Buffer.concat(chunks)
  const head = Buffer.alloc(12)
  head.write(magic, 0, 'latin1')
  head.writeUInt32LE(magic === 'RF64' ? 0xffffffff : body.length + 4, 4)
  head.write('WAVE', 8, 'latin1')
  return Buffer.concat([head, body])
}

const extension = (validBits: number, guid: string) => {
  const bytes = Buffer.alloc(24)
  bytes.writeUInt16LE(22, 0)
  bytes.writeUInt16LE(validBits, 2)
  bytes.write(guid, 8, 'hex')
  return bytes
}
const PCM_GUID = '0100000000001000800000aa00389b71'
const FLOAT_GUID = '0300000000001000800000aa00389b71'

function headerOf(file: Buffer) {
  return readWavHeader((at, length) => file.subarray(at, at + length), file.length)
}

function samplesIn(file: Buffer): number[][] {
  const name = path.join(folder, 'one.wav')
  writeFileSync(name, file)
  return samplesOf(name)
}

function samplesOf(name: string): number[][] {
  const open = new WavFile(name)
  const { samples, format } = open.header
  const channels = Array.from({ length: format.channels }, () => new Float64Array(samples))
  expect(open.read(samples, channels)).toBe(true)
  open.close()
  return channels.map((channel) => [...channel])
}

const data16 = Buffer.from([0x00, 0x80, 0xff, 0x7f, 0xff, 0xff])

describe('readWavHeader()', () => {
  it('reads the canonical header', () => {
    const file = wav([chunk('fmt ', fmtChunk({ tag: 1, bits: 16 })), chunk('data', data16)])
    expect(headerOf(file)).toEqual({
      format: { coding: 's16le', channels: 1, rateHz: 48_000, validBits: 16 },
      dataAt: (factOf('canonical-header').value as { samples: number }).samples,
      dataBytes: 6,
      samples: 3,
      missingBytes: 0,
    })
  })

  it('skips chunks that it does not know, with their pad byte', () => {
    const odd = chunk('LIST', Buffer.from('odd'))
    const file = wav([odd, chunk('fmt ', fmtChunk({ tag: 1, bits: 16 })), odd, chunk('data', data16), odd])
    expect(headerOf(file)).toMatchObject({ samples: 3, dataAt: 12 + 12 + 24 + 12 + 8 })
  })

  it.each([0, 0xffffffff])('reads to the end of the file when a streamed size is %i', (size) => {
    const file = wav([chunk('fmt ', fmtChunk({ tag: 1, bits: 16 })), chunk('data', data16, size)])
    expect(headerOf(file)).toMatchObject({ samples: 3, missingBytes: 0 })
  })

  it('says how many bytes a cut-off recording lacks, and leaves half a block out', () => {
    const file = wav([chunk('fmt ', fmtChunk({ tag: 1, bits: 16 })), chunk('data', data16, 1000)])
    expect(headerOf(file.subarray(0, file.length - 1))).toMatchObject({ samples: 2, missingBytes: 995 })
  })

  it('takes the size of an RF64 file from its ds64 chunk', () => {
    const ds64 = Buffer.alloc(28)
    ds64.writeBigUInt64LE(4n, 8)
    const file = wav(
      [chunk('ds64', ds64), chunk('fmt ', fmtChunk({ tag: 1, bits: 16 })), chunk('data', data16, 0xffffffff)],
      'RF64',
    )
    expect(headerOf(file)).toMatchObject({ samples: 2 })
  })

  it('reads WAVE_FORMAT_EXTENSIBLE with fewer valid bits than its container has', () => {
    const fmt = fmtChunk({ tag: 0xfffe, bits: 32, extension: extension(24, PCM_GUID) })
    expect(fmt).toHaveLength(factOf('extensible-fmt-chunk-size').value as number)
    const file = wav([chunk('fmt ', fmt), chunk('data', Buffer.alloc(8))])
    expect(headerOf(file).format).toEqual({ coding: 's32le', channels: 1, rateHz: 48_000, validBits: 24 })
  })

  it('tells a float in WAVE_FORMAT_EXTENSIBLE from a whole number of 32 bits', () => {
    const fmt = fmtChunk({ tag: 0xfffe, bits: 32, extension: extension(32, FLOAT_GUID) })
    const file = wav([chunk('fmt ', fmt), chunk('data', Buffer.alloc(8))])
    expect(headerOf(file).format.coding).toBe('f32le')
  })

  const good = chunk('fmt ', fmtChunk({ tag: 1, bits: 16 }))
  const fmt = (more: Fmt) => wav([chunk('fmt ', fmtChunk(more)), chunk('data', data16)])
  it.each<[string, Buffer, RegExp]>([
    ['a file that is no WAV', Buffer.from('ID3 something else entirely'), /not a WAV file/],
    ['a file of ten bytes', Buffer.alloc(10), /shorter than a WAV header/],
    ['big-endian samples', wav([good, chunk('data', data16)], 'RIFX'), /big-endian/],
    ['a file without samples', wav([good]), /no data chunk/],
    ['an empty data chunk at the end', wav([good, chunk('data', Buffer.alloc(0))]), /data chunk is empty/],
    ['a file without a format', wav([chunk('LIST', data16)]), /no fmt chunk/],
    ['samples before their format', wav([chunk('data', data16), good]), /before their format/],
    ['a short fmt chunk', wav([chunk('fmt ', Buffer.alloc(14)), chunk('data', data16)]), /needs 16/],
    ['A-law', fmt({ tag: 6, bits: 8 }), /A-law/],
    ['mu-law', fmt({ tag: 7, bits: 8 }), /mu-law/],
    ['8 bits', fmt({ tag: 1, bits: 8 }), /8 bits/],
    ['a float of 16 bits', fmt({ tag: 3, bits: 16 }), /float of 16 bits/],
    ['no channel', fmt({ tag: 1, bits: 16, channels: 0 }), /0 channels/],
    ['a rate that cannot carry 20 kHz', fmt({ tag: 1, bits: 16, rateHz: 22_050 }), /22050 Hz/],
    ['a wrong block size', fmt({ tag: 1, bits: 16, blockAlign: 4 }), /block size is 4/],
    [
      'an extension that is cut short',
      wav([chunk('fmt ', fmtChunk({ tag: 0xfffe, bits: 24 })), chunk('data', data16)]),
      /cut short/,
    ],
    [
      'a sub-format that is not known',
      fmt({ tag: 0xfffe, bits: 24, extension: extension(24, 'ff'.repeat(16)) }),
      /sub-format f+ is not known/,
    ],
    [
      'more valid bits than there are',
      fmt({ tag: 0xfffe, bits: 24, extension: extension(32, PCM_GUID) }),
      /32 of 24 bits/,
    ],
  ])('refuses %s by name', (_, file, says) => {
    expect(() => headerOf(file)).toThrow(says)
  })
})

describe('WavFile', () => {
  it('reads whole numbers of 16 and 24 bits at both ends of their range', () => {
    const file16 = wav([chunk('fmt ', fmtChunk({ tag: 1, bits: 16 })), chunk('data', data16)])
    expect(samplesIn(file16)).toEqual([[-1, 32767 / 32768, -1 / 32768]])
    for (const id of ['24-bit-000080', '24-bit-FFFF7F', '24-bit-FFFFFF']) {
      const fact = factOf(id)
      const body = Buffer.from(fact.bytes_in_file_order!, 'hex')
      const file = wav([chunk('fmt ', fmtChunk({ tag: 1, bits: 24 })), chunk('data', body)])
      expect(samplesIn(file)).toEqual([[fact.full_scale_fraction]])
    }
  })

  it('reads floats, and takes one that is not finite as full scale', () => {
    const body = Buffer.alloc(16)
    ;[0.25, -1.5, Infinity, -Infinity].forEach((value, i) => body.writeFloatLE(value, i * 4))
    const file = wav([chunk('fmt ', fmtChunk({ tag: 3, bits: 32 })), chunk('data', body)])
    expect(samplesIn(file)).toEqual([[0.25, -1.5, 1, -1]])
  })

  it.each([
    ['16', 'signed-integer'],
    ['24', 'signed-integer'],
    ['32', 'signed-integer'],
    ['32', 'floating-point'],
    ['64', 'floating-point'],
  ])('reads what sox writes with %s bits, %s, like raw samples of the same', (bits, encoding) => {
    const [name, raw] = [path.join(folder, 'sox.wav'), path.join(folder, 'sox.f64')]
    const format = ['-b', bits, '-e', encoding]
    const merged = ['synth', '0.5', 'sine', '330', 'sine', '441', 'vol', '0.3']
    execFileSync('sox', ['-R', '-r', '48000', '-n', '-c', '2', ...format, name, ...merged])
    execFileSync('sox', [name, '-t', 'f64', raw])
    const bytes = readFileSync(raw)
    const outside = Array.from({ length: bytes.length / 8 }, (_, i) => bytes.readDoubleLE(i * 8))
    const own = samplesOf(name)
    expect(own[0]).toHaveLength(24_000)
    const widest = Math.max(
      ...own.flatMap((channel, c) => channel.map((x, i) => Math.abs(x - outside[i * 2 + c]!))),
    )
    // sox itself works with 32 bit whole numbers
    expect(widest).toBeLessThan(2 ** -30)
  })

  it('reads six channels in pieces as it reads them at once, and again after rewind()', () => {
    const name = path.join(folder, 'six.wav')
    const channels = [1, 2, 3, 4, 5, 6].map((n) => sine(100_000, 100 * n, 48_000, n / 10))
    writeWav(name, channels, 48_000)
    const file = new WavFile(name)
    const piece = channels.map(() => new Float64Array(777))
    let read = 0
    for (; file.remaining >= 777; read += 777) {
      expect(file.read(777, piece)).toBe(true)
      piece.forEach((samples, c) => {
        expect(Math.abs(samples[500]! - channels[c]![read + 500]!)).toBeLessThan(2 ** -23)
      })
    }
    expect(file.read(777, piece)).toBe(false)
    file.rewind()
    expect(file.read(777, piece)).toBe(true)
    expect(piece[5]![776]).toBeCloseTo(channels[5]![776]!, 6)
    file.close()
  })

  it('names the file that is not there', () => {
    expect(() => new WavFile(path.join(folder, 'none.wav'))).toThrow(/none\.wav cannot be opened: ENOENT/)
  })
})

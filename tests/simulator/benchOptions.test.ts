import { writeFileSync } from 'node:fs'
import path from 'node:path'
import { describe, expect, it } from 'vitest'
import { OptionError, readBenchOptions } from '../../simulator/benchOptions.ts'
import { temporaryFolder } from '../helpers/temporaryFolder.ts'

const ENV = { EVENSTRUNG_URL: 'http://127.0.0.1:4180', EVENSTRUNG_BENCH_TOKEN: 'a token' }

describe('readBenchOptions()', () => {
  it('makes window a six-channel bench and door one at the jack', () => {
    expect(readBenchOptions(['--bench', 'window'], ENV)).toMatchObject({
      bench: 'window',
      source: 'model',
      channelKind: 'six',
      mainsHz: 50,
      frameMs: 10,
      speed: 1,
      hand: false,
      token: 'a token',
    })
    expect(readBenchOptions(['--bench', 'door'], ENV)).toMatchObject({ channelKind: 'one', mainsHz: 50 })
  })

  it('takes the address from the command line before the environment, without a last slash', () => {
    expect(readBenchOptions(['--url', 'https://bench.harrowlane.test/'], ENV).url).toBe(
      'https://bench.harrowlane.test',
    )
    expect(readBenchOptions([], ENV).url).toBe('http://127.0.0.1:4180')
  })

  it('reads the options of a recording and of a stream', () => {
    expect(
      readBenchOptions(['--source', 'wav', '--file', 'a.wav', '--offset-db=-12.5', '--real-time'], ENV),
    ).toMatchObject({ source: 'wav', file: 'a.wav', offsetDb: -12.5, realTime: true })
    expect(
      readBenchOptions(
        [
          '--source',
          'pcm',
          '--rate',
          '96000',
          '--format',
          'f32le',
          '--channels',
          '8',
          '--use-channels',
          '3,4,5,6,7,8',
        ],
        ENV,
      ),
    ).toMatchObject({
      rateHz: 96_000,
      coding: 'f32le',
      channels: 8,
      useChannels: [3, 4, 5, 6, 7, 8],
      realTime: null,
    })
    expect(readBenchOptions(['--offset-db=1,2,3,4,5,6'], ENV).offsetDb).toEqual([1, 2, 3, 4, 5, 6])
  })

  it('finds the token of its bench in the file of secrets', () => {
    const folder = temporaryFolder()
    writeFileSync(
      path.join(folder, 'secrets.json'),
      JSON.stringify({ jwtSecret: 'x', benchTokens: { door: 'for door' } }),
    )
    const env = { EVENSTRUNG_URL: ENV.EVENSTRUNG_URL, DATA_DIR: folder }
    expect(readBenchOptions(['--bench', 'door'], env).token).toBe('for door')
    expect(() => readBenchOptions(['--bench', 'window'], env)).toThrow(/no token for bench window/)
    expect(() => readBenchOptions([], { ...env, DATA_DIR: path.join(folder, 'nowhere') })).toThrow(
      OptionError,
    )
  })

  it.each([
    [['--speed', '0'], /--speed/],
    [['--speed', 'fast'], /--speed/],
    [['--seed', '-1'], /--seed/],
    [['--seed', '1.5'], /--seed/],
    [['--frame-ms', '7'], /--frame-ms/],
    [['--mains', '55'], /--mains/],
    [['--format', 'mp3'], /--format/],
    [['--source', 'wav'], /--file/],
    [['--offset-db', 'loud'], /--offset-db/],
    [['--bench', '../x'], /--bench/],
    [['--url', 'not an address'], /--url/],
    [['--token', 'secret'], /token/],
  ])('refuses %j in one sentence', (args, words) => {
    expect(() => readBenchOptions(args, ENV)).toThrow(OptionError)
    expect(() => readBenchOptions(args, ENV)).toThrow(words)
  })

  it('asks for the address when there is none', () => {
    expect(() => readBenchOptions([], { EVENSTRUNG_BENCH_TOKEN: 'a token' })).toThrow(/EVENSTRUNG_URL/)
  })
})

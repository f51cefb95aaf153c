import { spawn } from 'node:child_process'
import type { ChildProcess } from 'node:child_process'
import { afterEach, beforeEach, expect, test } from 'vitest'
import { helloAnswer, problem, startFakeBenchServer } from '../helpers/fakeBenchServer.ts'
import type { FakeBenchServer } from '../helpers/fakeBenchServer.ts'
import { buildOrder } from '../helpers/countingSource.ts'

const TOKEN = 'a-token-that-only-this-test-knows-456'

let server: FakeBenchServer
let child: ChildProcess
let output: string

beforeEach(async () => {
  server = await startFakeBenchServer()
  output = ''
})

afterEach(async () => {
  child.kill('SIGKILL')
  await server.close()
})

function startBench(args: string[], env: Record<string, string> = {}): ChildProcess {
  child = spawn(process.execPath, ['--import', 'tsx', 'simulator/main.ts', ...args], {
    env: { PATH: process.env.PATH, EVENSTRUNG_URL: server.url, EVENSTRUNG_BENCH_TOKEN: TOKEN, ...env },
    stdio: ['pipe', 'pipe', 'pipe'],
  })
  for (const stream of [child.stdout!, child.stderr!]) {
    stream.setEncoding('utf8').on('data', (text: string) => {
      output += text
    })
  }
  return child
}

const ended = (): Promise<number | null> =>
  new Promise((resolve) => child.once('exit', (code) => resolve(code)))

test.each(['SIGTERM', 'SIGINT'] as const)(
  'a bench streams its run and ends cleanly on %s',
  async (signal) => {
    server.answerHello = () => helloAnswer({ order: buildOrder() })
    startBench(['--bench', 'window', '--seed', '5'])
    const { batch, accept } = await server.batches.take()
    expect(batch.frames[0]!.levelMdb).toHaveLength(6)
    accept()
    child.kill(signal)
    expect(await ended()).toBe(0)
    expect(output).not.toContain(TOKEN)
  },
)

test('a bench that was replaced stays away and says so, until it is ended', async () => {
  startBench(['--bench', 'door'])
  await server.hellos.take()
  server.socket().emit('bench:replaced', problem('bench.replaced'))
  await expect.poll(() => output, { timeout: 10_000 }).toContain('stays away')
  expect(child.exitCode).toBeNull()
  child.kill('SIGTERM')
  expect(await ended()).toBe(0)
})

test('raw samples on standard input make a bench', async () => {
  server.answerHello = () => helloAnswer({ order: buildOrder() })
  startBench(['--bench', 'door', '--source', 'pcm', '--channels', '1', '--format', 's16le', '--no-real-time'])
  // two seconds of a square wave at half of full scale
  child.stdin!.end(
    Buffer.from(Int16Array.from({ length: 96_000 }, (_, i) => (i % 96 < 48 ? 16_384 : -16_384)).buffer),
  )
  const { batch } = await server.batches.take()
  expect(Math.abs(batch.frames[20]!.levelMdb[0]! + 6021)).toBeLessThan(100)
  child.kill('SIGTERM')
  expect(await ended()).toBe(0)
})

test('a mistake on the command line is one sentence and exit code 2', async () => {
  startBench(['--bench', 'window', '--speed', '1000'])
  expect(await ended()).toBe(2)
  expect(output.trim().split('\n')).toHaveLength(1)
  expect(output).toContain('--speed')
})

import { spawn } from 'node:child_process'
import type { ChildProcess } from 'node:child_process'
import path from 'node:path'
import { io } from 'socket.io-client'
import type { Socket } from 'socket.io-client'
import { afterEach, expect, test } from 'vitest'
import type { BenchToServer, BenchVerify, RunOrder, ServerToBench } from '../../src/shared/contract/frames.ts'
import { helloOf, quietFrame } from '../helpers/benchTalk.ts'
import { runConformance } from './benchConformance.ts'

const TOKEN = 'a-token-for-the-conformance-suite-only'
const OPTIONS = { token: TOKEN, patienceMs: 15_000, stayAwayMs: 1500 }

let bench: ChildProcess | null = null
let careless: Socket<ServerToBench, BenchToServer> | null = null

afterEach(() => {
  bench?.kill('SIGKILL')
  bench = null
  careless?.disconnect()
  careless = null
})

function startSimulator(url: string): void {
  const main = path.resolve(import.meta.dirname, '../../simulator/main.ts')
  bench = spawn(
    process.execPath,
    ['--import', 'tsx', main, '--bench', 'window', '--url', url, '--seed', '7'],
    {
      env: { ...process.env, EVENSTRUNG_BENCH_TOKEN: TOKEN },
      stdio: 'ignore',
    },
  )
}

test('the simulated bench keeps to the protocol', { timeout: 60_000 }, async () => {
  const report = await runConformance(OPTIONS, startSimulator)
  expect(report.checks.filter((check) => !check.passed)).toEqual([])
  expect(report.checks.length).toBeGreaterThan(20)
})

const VERIFY: BenchVerify = {
  id: '5b1f6e64-6f0e-4b0f-8f43-0e9a5a1f0a11',
  checkStandard: 'none',
  tones: [
    { channel: 1, appliedMdb: -20_000, measuredMdb: -20_000 },
    { channel: 1, appliedMdb: -40_000, measuredMdb: -40_000 },
  ],
  quiet: [],
  resistances: [],
  currents: [],
}

/** A bench that never looks at an answer: it counts on as if everything had arrived. */
function startCareless(url: string): void {
  const socket: Socket<ServerToBench, BenchToServer> = io(`${url}/bench`, {
    transports: ['websocket'],
    auth: { token: TOKEN },
  })
  careless = socket
  socket.on('connect', () => {
    socket.emit('bench:hello', helloOf(), () => socket.emit('bench:verify', VERIFY, () => undefined))
  })
  socket.on('run:start', (order: RunOrder) => {
    for (let from = order.from; from < order.from + 400; from += 10) {
      const frames = Array.from({ length: 10 }, quietFrame.bind(null, 6))
      socket.emit('bench:frames', { run: order.run, from, frames, events: [] }, () => undefined)
    }
  })
}

test('the suite finds a bench that does not wait for answers', { timeout: 60_000 }, async () => {
  const report = await runConformance({ ...OPTIONS, patienceMs: 1500 }, startCareless)
  const broken = report.checks.filter((check) => !check.passed).map((check) => check.name)
  expect(broken).toContain('one batch is in flight')
  expect(broken).toContain('after a gap the frames come from the number that was named')
})

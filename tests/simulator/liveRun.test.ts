import { randomUUID } from 'node:crypto'
import { afterAll, afterEach, beforeAll, expect, test } from 'vitest'
import { demoId } from '../../db/seeds/demo.ts'
import { createBenchClient } from '../../simulator/bench/benchClient.ts'
import type { BenchClient } from '../../simulator/bench/benchClient.ts'
import { makeModelledSource } from '../../simulator/sources/modelledSource.ts'
import type { ModelledSourceOptions } from '../../simulator/sources/modelledSource.ts'
import type { RunView } from '../../src/shared/contract/runs.ts'
import { startOf } from '../helpers/benchTalk.ts'
import { startTestServer } from '../helpers/runningServer.ts'
import type { TestPerson, TestServer } from '../helpers/runningServer.ts'

const SEALED_WITHIN_MS = 60_000
const FAST = 50

let at: TestServer
let installer: TestPerson
let clients: BenchClient[] = []
let serials = 0

beforeAll(async () => {
  at = await startTestServer()
  installer = await at.signIn('installer')
  await installer.call('cautions.acknowledge', { body: { id: randomUUID() } })
})

afterAll(() => at.close())

afterEach(() => {
  for (const client of clients) client.stop()
  clients = []
})

function startBench(key: 'window' | 'door', options: Partial<ModelledSourceOptions> = {}): BenchClient {
  const client = createBenchClient({
    url: at.url,
    token: at.benchTokens[key]!,
    source: makeModelledSource({
      seed: 3,
      channelKind: key === 'window' ? 'six' : 'one',
      circuit: 'buffered',
      hand: true,
      timeScale: FAST,
      ...options,
    }),
    backoffMs: { first: 20, most: 100 },
    jitter: () => 1,
  })
  clients.push(client)
  client.start()
  return client
}

async function ready(key: 'window' | 'door'): Promise<void> {
  const id = demoId(`bench ${key}`)
  await expect
    .poll(async () => (await installer.call('benches.list')).items.find((bench) => bench.id === id), {
      timeout: 10_000,
    })
    .toMatchObject({ connected: true, verified: true })
}

async function startRun(key: 'window' | 'door', model = 'LC'): Promise<string> {
  const body = startOf(`HL2612${100 + serials++}`, {
    benchId: demoId(`bench ${key}`),
    modelId: demoId(`model ${model}`),
  })
  return (await installer.call('runs.start', { body })).id
}

async function sealed(run: string): Promise<RunView> {
  const view = (): Promise<RunView> => installer.call('runs.read', { params: { id: run } })
  await expect
    .poll(async () => (await view()).storage, { timeout: SEALED_WITHIN_MS, interval: 100 })
    .toBe('stored')
  return view()
}

test(
  'a simulated bench verifies itself and brings a run to a stored verdict',
  { timeout: 90_000 },
  async () => {
    startBench('window')
    await ready('window')
    const view = await sealed(await startRun('window'))
    expect(view.status).toBe('sealed')
    expect(view.measured.verdict).toBe('pass')
    expect(view.measured.frames).toBeGreaterThan(3500)
    expect(view.committedFrames).toBe(view.measured.frames)
    expect(view.setup.verified).toBe(true)
  },
)

test(
  'the panel lays an instrument with a fault on the bench, and the run fails for it',
  { timeout: 90_000 },
  async () => {
    startBench('door')
    await ready('door')
    await installer.call('benches.simulate', {
      params: { id: demoId('bench door') },
      body: { kind: 'place', seed: 8, faults: [{ fault: 'currentHigh', severity: 1 }], scatterDb: 0.8 },
    })
    const view = await sealed(await startRun('door'))
    expect(view.measured.verdict).toBe('fail')
    const outside = view.measured.results.filter(({ result }) => result === 'outside').map(({ rule }) => rule)
    expect(outside).toContain('currentPlugged')
  },
)

test('a model with a parallel circuit lies on the bench as such', { timeout: 90_000 }, async () => {
  startBench('window', { faults: [{ fault: 'elementShorted', severity: 1, stringNo: 2 }] })
  await ready('window')
  const view = await sealed(await startRun('window', 'RD'))
  expect(view.measured.strings.map((string) => string.state)).toEqual(new Array(6).fill('silent'))
})

test('a run goes on over a restart of the server and of the bench', { timeout: 120_000 }, async () => {
  const first = startBench('window')
  await ready('window')
  const run = await startRun('window')
  const framesOf = async (): Promise<number> =>
    (await installer.call('runs.read', { params: { id: run } })).measured.frames
  await expect.poll(framesOf, { timeout: 30_000, interval: 50 }).toBeGreaterThan(600)
  await at.restart()
  await expect.poll(framesOf, { timeout: 30_000, interval: 50 }).toBeGreaterThan(1000)
  first.stop()
  // a new process: the frames that the old one held are gone, and the hand has to plug in again
  const second = startBench('window')
  await expect.poll(() => second.runId(), { timeout: 10_000 }).toBe(run)
  const view = await sealed(run)
  expect(view.status).toBe('sealed')
  expect(view.measured.verdict).toBe('pass')
  expect(view.committedFrames).toBe(view.measured.frames)
})

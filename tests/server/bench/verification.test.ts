import { randomUUID } from 'node:crypto'
import { afterAll, afterEach, beforeAll, beforeEach, expect, test } from 'vitest'
import { demoId } from '../../../db/seeds/demo.ts'
import type { BenchHello, BenchVerify } from '../../../src/shared/contract/frames.ts'
import { helloOf, sayHello, startOf } from '../../helpers/benchTalk.ts'
import { startTestServer } from '../../helpers/runningServer.ts'
import type { BenchClient, TestPerson, TestServer } from '../../helpers/runningServer.ts'

const WINDOW = demoId('bench window')
let at: TestServer
let installer: TestPerson
let bench: BenchClient
let serials = 0

beforeAll(async () => {
  at = await startTestServer()
  installer = await at.signIn('installer')
  await installer.call('cautions.acknowledge', { body: { id: randomUUID() } })
})

afterAll(() => at.close())

beforeEach(() => {
  bench = at.bench(at.benchTokens.window!)
})

afterEach(() => bench.disconnect())

const QUIET_MDB = [-101_000, -102_000, -103_000, -104_000, -105_000, -106_000]

/** Readings of the check standard that pass, each channel with a floor of its own. */
function goodReadings(channels: number[] = [1, 2, 3, 4, 5, 6]): BenchVerify {
  return {
    id: randomUUID(),
    checkStandard: 'signal box 1',
    tones: channels.flatMap((channel) =>
      [-20_000, -60_000].map((mdb) => ({ channel, appliedMdb: mdb, measuredMdb: mdb })),
    ),
    quiet: channels.map((channel) => ({
      channel,
      flatMdb: QUIET_MDB[Math.max(0, channel - 1)]!,
      aMdb: -110_000,
    })),
    resistances: [],
    currents: [],
  }
}

/** Starts a run, stops it again and gives what it was set up with. */
async function setupOfRun() {
  const { id, setup } = await installer.call('runs.start', { body: startOf(`HL2601${100 + serials++}`) })
  const action = { kind: 'stop', reason: 'test over' }
  await installer.call('runs.act', { params: { id }, body: { id: randomUUID(), action } })
  await expect.poll(() => at.server.board.find(id)).toBeUndefined()
  return setup
}

async function verifiedInList(): Promise<boolean> {
  const { items } = await installer.call('benches.list')
  return items.find(({ id }) => id === WINDOW)!.verified
}

test('a verification holds for the set-up that was verified, with the floors that were read', async () => {
  await sayHello(bench)
  const readings = goodReadings()
  expect(await bench.emitWithAck('bench:verify', readings)).toMatchObject({ ok: true, passed: true })
  expect(await sayHello(bench)).toMatchObject({ ok: true, verified: true })
  expect(await verifiedInList()).toBe(true)
  expect(await setupOfRun()).toMatchObject({
    verified: true,
    verificationId: readings.id,
    floorDb: QUIET_MDB.map((mdb) => mdb / 1000),
  })
})

const HELLO = helloOf()
const others: [string, Partial<BenchHello>][] = [
  ['another kind of channels', { channelKind: 'one' }],
  ['a capability more', { capabilities: [...HELLO.capabilities, 'current'] }],
  ['another version of an algorithm', { algorithms: { test: '2' } }],
  ['an algorithm more', { algorithms: { ...HELLO.algorithms, pitch: '1' } }],
]

test.each(others)('a bench that comes back with %s is not verified', async (_, more) => {
  await sayHello(bench)
  await bench.emitWithAck('bench:verify', goodReadings())
  expect(await sayHello(bench, more)).toMatchObject({ ok: true, verified: false, verifiedUntil: null })
  expect(await verifiedInList()).toBe(false)
  expect(await setupOfRun()).toMatchObject({ verified: false, verificationId: null })
})

test('a bench that claims less than was verified stays verified', async () => {
  await sayHello(bench)
  await bench.emitWithAck('bench:verify', goodReadings())
  expect(await sayHello(bench, { capabilities: ['sixLevels'] })).toMatchObject({ ok: true, verified: true })
})

test('a record that does not tell what was verified holds for nothing', async () => {
  await sayHello(bench)
  const readings = goodReadings()
  await bench.emitWithAck('bench:verify', readings)
  await at.knex('bench_verifications').where({ id: readings.id }).update({ channel_kind: null })
  expect(await sayHello(bench)).toMatchObject({ ok: true, verified: false })
  expect(await verifiedInList()).toBe(false)
})

test('the same verification twice at once gives the same answer twice and is stored once', async () => {
  await sayHello(bench)
  for (let round = 0; round < 5; round++) {
    const readings = goodReadings()
    const [first, second] = await Promise.all([
      bench.emitWithAck('bench:verify', readings),
      bench.emitWithAck('bench:verify', readings),
    ])
    expect(first).toMatchObject({ ok: true, passed: true })
    expect(second).toEqual(first)
    expect(await at.knex('bench_verifications').where({ id: readings.id })).toHaveLength(1)
  }
})

test("another bench's verification is not this one's", async () => {
  await sayHello(bench)
  const readings = goodReadings()
  await bench.emitWithAck('bench:verify', readings)
  const door = at.bench(at.benchTokens.door!)
  await sayHello(door, { channelKind: 'one' })
  expect(await door.emitWithAck('bench:verify', { ...goodReadings([0]), id: readings.id })).toMatchObject({
    ok: false,
    problem: { code: 'record.exists' },
  })
})

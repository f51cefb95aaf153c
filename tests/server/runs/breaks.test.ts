import { randomUUID } from 'node:crypto'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { demoId } from '../../../db/seeds/demo.ts'
import { findRun, insertAction, insertRun, insertSegment } from '../../../server/runs/runs.queries.ts'
import { TraceBuffer } from '../../../server/runs/traceBuffer.ts'
import type { RunActionBody, RunView } from '../../../src/shared/contract/runs.ts'
import { batchOf, quietFrame, sayHello, sendFrames, startOf } from '../../helpers/benchTalk.ts'
import { startTestServer } from '../../helpers/runningServer.ts'
import type { BenchClient, TestPerson, TestServer } from '../../helpers/runningServer.ts'

let at: TestServer
let installer: TestPerson
let bench: BenchClient
let serials = 0

beforeAll(async () => {
  at = await startTestServer()
  installer = await at.signIn('installer')
  await installer.call('cautions.acknowledge', { body: { id: randomUUID() } })
  bench = await newBench('window')
})

afterAll(() => at.close())

async function newBench(name: 'window' | 'door'): Promise<BenchClient> {
  const socket = at.bench(at.benchTokens[name]!)
  await sayHello(socket)
  return socket
}

function newSerial(): string {
  return `HL2640${100 + serials++}`
}

function start(more: object = {}): Promise<RunView> {
  return installer.call('runs.start', { body: startOf(newSerial(), more) })
}

function act(run: string, action: RunActionBody, id: string = randomUUID()): Promise<RunView> {
  return installer.call('runs.act', { params: { id: run }, body: { id, action } })
}

function read(run: string): Promise<RunView> {
  return installer.call('runs.read', { params: { id: run } })
}

async function ended(run: string): Promise<RunView> {
  await expect.poll(() => at.server.board.find(run)).toBeUndefined()
  return read(run)
}

async function restart(): Promise<void> {
  await at.restart()
  bench = await newBench('window')
}

const STOP: RunActionBody = { kind: 'stop', reason: 'string broke' }
const ENTER: RunActionBody = {
  kind: 'enterValue',
  rule: 'contactTip',
  stringNo: null,
  value: 0.02,
  u: 0.002,
  meter: 'meter 3',
}

test('a stop that was stored before a crash ends the run as stopped, by the person who stopped it', async () => {
  const run = await start()
  await sendFrames(bench, batchOf(run.id, 0, 50))
  const row = (await findRun(at.knex, run.id))!
  await insertAction(at.knex, row.seq, {
    id: randomUUID(),
    no: 1,
    frame: 50,
    userId: demoId('lead@harrowlane.test'),
    person: 'Lorcan Weir',
    at: new Date().toISOString(),
    action: STOP,
  })
  await restart()
  const view = await ended(run.id)
  expect(view).toMatchObject({ status: 'stopped', endReason: 'string broke', measured: { phase: 'stopped' } })
  const audit = await at
    .knex('audit_entries')
    .where({ subject_id: run.id })
    .orderBy('id')
    .select('action', 'actor')
  expect(audit.at(-1)).toEqual({ action: 'run.stopped', actor: 'Lorcan Weir' })
  expect(await installer.call('runs.recompute', { params: { id: run.id } })).toMatchObject({ sameBits: true })
})

test('a run that is stopped while restored actions wait for their frames computes to the same again', async () => {
  const run = await start()
  await sendFrames(bench, batchOf(run.id, 0, 100))
  await act(run.id, ENTER)
  await restart()
  await act(run.id, STOP)
  const view = await ended(run.id)
  expect(view.actions.map(({ frame, action }) => [frame, action.kind])).toEqual([
    [100, 'enterValue'],
    [100, 'stop'],
  ])
  expect(view.measured.entered).toMatchObject([{ rule: 'contactTip' }])
  const report = await installer.call('runs.recompute', { params: { id: run.id } })
  expect(report).toMatchObject({ sameVerdict: true, sameBits: true, differences: [] })
})

test('a retry of the action that ended the run is answered like the first time', async () => {
  const run = await start()
  const id = randomUUID()
  await act(run.id, STOP, id)
  await ended(run.id)
  expect(await act(run.id, STOP, id)).toMatchObject({ status: 'stopped', storage: 'stored' })
  await expect(act(run.id, ENTER)).rejects.toMatchObject({ problem: { code: 'run.not-open' } })
})

test('a run whose start was stored and never answered is found by the retry, and can be stopped', async () => {
  const before = await start()
  await act(before.id, STOP)
  const { instrumentId, setup } = await ended(before.id)
  const id = randomUUID()
  await insertRun(at.knex, {
    id,
    instrumentId,
    benchId: before.benchId,
    openedBy: before.openedBy.id,
    reason: 'new',
    openedAt: new Date(),
    runtime: 'test',
    setup,
  })
  const again = await installer.call('runs.start', { body: startOf(before.serial, { id }) })
  expect(again).toMatchObject({ id, status: 'open', storage: 'live' })
  expect(await sendFrames(bench, batchOf(id, 0, 5))).toMatchObject({ ok: true, next: 5 })
  await act(id, STOP)
  expect(await ended(id)).toMatchObject({ status: 'stopped' })
})

test('two starts at once of one new serial: one wins, the other is told where; the same request twice is one run', async () => {
  await newBench('door')
  const door = demoId('bench door')
  for (let round = 0; round < 5; round++) {
    const serial = newSerial()
    const [a, b] = [startOf(serial), startOf(serial, { benchId: door })]
    const answers = await Promise.allSettled([a, b].map((body) => installer.call('runs.start', { body })))
    const won = answers.flatMap((answer) => (answer.status === 'fulfilled' ? [answer.value] : []))
    const lost = answers.flatMap((answer) => (answer.status === 'rejected' ? [answer.reason as unknown] : []))
    expect(won).toHaveLength(1)
    expect(lost).toMatchObject([
      { problem: { code: 'run.serial-busy', facts: { runId: won[0]!.id, serial } } },
    ])
    await act(won[0]!.id, STOP)
    await ended(won[0]!.id)

    const body = startOf(newSerial())
    const same = await Promise.all([1, 2, 3].map(() => installer.call('runs.start', { body })))
    expect(new Set(same.map((view) => view.id))).toEqual(new Set([body.id]))
    await act(body.id, STOP)
    await ended(body.id)
  }
})

test('an open run that cannot be read back ends interrupted and keeps the server from nothing', async () => {
  const run = await start()
  for (let from = 0; from < 3200; from += 200) await sendFrames(bench, batchOf(run.id, from, 200))
  await expect.poll(() => at.server.board.find(run.id)?.committed).toBe(3000)
  const { seq } = (await findRun(at.knex, run.id))!
  const segment = await at.knex('trace_segments').where({ run_seq: seq }).first<{ data: Buffer }>('data')
  const changed = Buffer.from(segment.data)
  changed[changed.length - 5]! ^= 1
  await at.knex('trace_segments').where({ run_seq: seq }).update({ data: changed })
  await restart()
  expect(await read(run.id)).toMatchObject({
    status: 'interrupted',
    endReason: expect.stringMatching(/could not be read/) as string,
  })
  const next = await start()
  await act(next.id, STOP)
  await ended(next.id)
})

test('a segment is stored once; other bytes in its place are refused', async () => {
  const run = await start()
  const { seq } = (await findRun(at.knex, run.id))!
  const segmentOf = (frames: number) => {
    const buffer = new TraceBuffer(6)
    for (let i = 0; i < frames; i++) buffer.append(quietFrame(), [])
    return buffer.pack(90, 0, frames)
  }
  await insertSegment(at.knex, seq, segmentOf(3), new Date())
  await insertSegment(at.knex, seq, segmentOf(3), new Date())
  await expect(insertSegment(at.knex, seq, segmentOf(4), new Date())).rejects.toThrow(/other bytes/)
  await at.knex('trace_segments').where({ run_seq: seq }).delete()
  await act(run.id, STOP)
  await ended(run.id)
})

test('a run streams on for at most half an hour', async () => {
  const run = await start()
  for (let from = 0; from < 180_000; from += 200) await sendFrames(bench, batchOf(run.id, from, 200))
  expect(await ended(run.id)).toMatchObject({
    status: 'interrupted',
    endReason: expect.stringMatching(/half an hour/) as string,
  })
}, 120_000)

test('controls that are not set are refused at their field', async () => {
  const body = startOf(newSerial())
  const refused = installer.call('runs.start', {
    body: { ...body, conditions: { ...body.conditions, controlsSet: false } },
  })
  await expect(refused).rejects.toMatchObject({
    problem: { code: 'request.invalid', fields: [{ path: 'body.conditions.controlsSet' }] },
  })
})

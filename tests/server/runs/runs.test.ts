import { randomUUID } from 'node:crypto'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { demoId } from '../../../db/seeds/demo.ts'
import type { RunActionBody } from '../../../src/shared/contract/runs.ts'
import { batchOf, sayHello, sendFrames, startOf } from '../../helpers/benchTalk.ts'
import { startTestServer } from '../../helpers/runningServer.ts'
import type { BenchClient, TestPerson, TestServer } from '../../helpers/runningServer.ts'
import { SIX_CHANNEL } from '../../helpers/runSetup.ts'
import { buildCheck } from '../../helpers/traceBuilder.ts'

let at: TestServer
let installer: TestPerson
let repairer: TestPerson
let lead: TestPerson
let bench: BenchClient

const DOOR = demoId('bench door')

beforeAll(async () => {
  at = await startTestServer({ env: { BENCH_SILENCE_SECONDS: '8' } })
  installer = await at.signIn('installer')
  repairer = await at.signIn('repairer')
  lead = await at.signIn('lead')
  bench = at.bench(at.benchTokens.window!)
  await sayHello(bench, { capabilities: SIX_CHANNEL })
})

afterAll(() => at.close())

function act(person: TestPerson, run: string, action: RunActionBody, id: string = randomUUID()) {
  return person.call('runs.act', { params: { id: run }, body: { id, action } })
}

async function stop(run: string, person: TestPerson = lead): Promise<void> {
  await act(person, run, { kind: 'stop', reason: 'test over' })
  await ended(run)
}

async function ended(run: string): Promise<void> {
  await expect.poll(() => at.server.board.find(run)).toBeUndefined()
}

test('runs.start asks for the cautions first, once a shift', async () => {
  await expect(installer.call('runs.start', { body: startOf('HL2690001') })).rejects.toMatchObject({
    problem: { code: 'cautions.needed' },
  })
  for (const person of [installer, repairer, lead])
    await person.call('cautions.acknowledge', { body: { id: randomUUID() } })
  const run = await installer.call('runs.start', { body: startOf('HL2690001') })
  expect(run).toMatchObject({
    serial: 'HL2690001',
    status: 'open',
    storage: 'live',
    setup: { verified: false },
  })
  await stop(run.id)
})

test('runs.start refuses what cannot be checked, and says why', async () => {
  const start = (serial: string, more: object) =>
    installer.call('runs.start', { body: startOf(serial, more) })
  await expect(start('HL2690002', { modelId: null })).rejects.toMatchObject({
    problem: { code: 'instrument.unknown' },
  })
  await expect(start('HL2690002', { modelId: randomUUID() })).rejects.toMatchObject({
    problem: { code: 'model.unknown' },
  })
  await expect(start('HL2690001', { modelId: demoId('model RD') })).rejects.toMatchObject({
    problem: { code: 'instrument.model-differs', facts: { model: 'Linden concert' } },
  })
  await expect(start('HL2690002', { benchId: randomUUID() })).rejects.toMatchObject({
    problem: { code: 'bench.unknown' },
  })
  await expect(start('HL2690002', { benchId: DOOR })).rejects.toMatchObject({
    problem: { code: 'bench.offline', facts: { bench: 'Door' } },
  })
  await expect(start('hl-26', {})).rejects.toMatchObject({ problem: { code: 'request.invalid' } })
  await at
    .knex('threshold_revisions')
    .where({ model_id: demoId('model RD') })
    .update({ status: 'withdrawn' })
  await expect(start('HL2690003', { modelId: demoId('model RD') })).rejects.toMatchObject({
    problem: { code: 'sheet.none-in-force', facts: { model: 'Rowan dreadnought' } },
  })
  expect(await at.knex('instruments').where('serial', 'like', 'HL269000[23]')).toEqual([])
})

test('a run is judged by the revision that was in force when it began', async () => {
  const run = await installer.call('runs.start', { body: startOf('HL2690004') })
  const [sheet] = await at.knex('threshold_revisions').where({ id: run.setup.sheet.id }).select('*')
  const id = randomUUID()
  await at.knex('threshold_revisions').insert({
    ...(sheet as object),
    id,
    revision: 2,
    label: 'LC-2',
    in_force_from: new Date(),
    sheet: JSON.stringify({ ...run.setup.sheet, id, revision: 2, label: 'LC-2' }),
  })
  await sendFrames(bench, batchOf(run.id, 0, 10))
  expect((await installer.call('runs.read', { params: { id: run.id } })).setup.sheet.label).toBe('LC-1')
  await stop(run.id)
  const next = await installer.call('runs.start', { body: startOf('HL2690004') })
  expect(next.setup.sheet.label).toBe('LC-2')
  await stop(next.id)
})

test('only the opener acts; a lead may stop it or take it over with a reason', async () => {
  const run = await installer.call('runs.start', { body: startOf('HL2690005') })
  const enter: RunActionBody = {
    kind: 'enterValue',
    rule: 'contactTip',
    stringNo: null,
    value: 0.02,
    u: 0.002,
    meter: 'meter 3',
  }
  const notYours = { problem: { code: 'run.not-yours', status: 403, facts: { person: 'Ines Marlowe' } } }
  await expect(act(repairer, run.id, enter)).rejects.toMatchObject(notYours)
  await expect(act(repairer, run.id, { kind: 'stop', reason: 'mine now' })).rejects.toMatchObject(notYours)
  await expect(act(lead, run.id, enter)).rejects.toMatchObject(notYours)
  const takeOver = (person: TestPerson) =>
    person.call('runs.takeOver', {
      params: { id: run.id },
      body: { id: randomUUID(), reason: 'shift change' },
    })
  await expect(takeOver(repairer)).rejects.toMatchObject(notYours)
  expect(await takeOver(lead)).toMatchObject({ openedBy: { name: 'Lorcan Weir' } })
  expect((await act(lead, run.id, enter)).measured.entered).toMatchObject([
    { rule: 'contactTip', person: 'Lorcan Weir' },
  ])
  await expect(act(installer, run.id, enter)).rejects.toMatchObject({ problem: { code: 'run.not-yours' } })
  await stop(run.id)
  const view = await installer.call('runs.read', { params: { id: run.id } })
  expect(view.actions.map(({ no, person, action }) => [no, person, action.kind])).toEqual([
    [1, 'Lorcan Weir', 'changePerson'],
    [2, 'Lorcan Weir', 'enterValue'],
    [3, 'Lorcan Weir', 'stop'],
  ])
  const audit = await at
    .knex('audit_entries')
    .where({ subject_id: run.id })
    .orderBy('id')
    .select('action', 'actor')
  expect(audit).toEqual([
    { action: 'run.opened', actor: 'Ines Marlowe' },
    { action: 'run.takenOver', actor: 'Lorcan Weir' },
    { action: 'run.stopped', actor: 'Lorcan Weir' },
  ])
})

test('an action that does not fit the step is refused and not stored; the same id again changes nothing', async () => {
  const run = await installer.call('runs.start', { body: startOf('HL2690006') })
  await sendFrames(bench, batchOf(run.id, 0, 10))
  await expect(act(installer, run.id, { kind: 'noSignal', stringNo: 3 })).rejects.toMatchObject({
    problem: { code: 'run.action-not-now', status: 409 },
  })
  const id = randomUUID()
  const enter: RunActionBody = {
    kind: 'enterValue',
    rule: 'insulation',
    stringNo: null,
    value: 50,
    u: 5,
    meter: 'meter 3',
  }
  await act(installer, run.id, enter, id)
  await act(installer, run.id, enter, id)
  const view = await installer.call('runs.read', { params: { id: run.id } })
  expect(view.actions).toMatchObject([{ id, no: 1, frame: 10 }])
  await stop(run.id, installer)
  await expect(act(installer, run.id, enter)).rejects.toMatchObject({ problem: { code: 'run.not-open' } })
})

test('a stopped run has no verdict, frees bench and serial, and leaves the standing alone', async () => {
  const run = await installer.call('runs.start', { body: startOf('HL2690007') })
  await sendFrames(bench, batchOf(run.id, 0, 30))
  await stop(run.id, installer)
  const page = await installer.call('instruments.read', { params: { serial: 'HL2690007' } })
  expect(page).toMatchObject({
    instrument: { lastVerdict: null },
    runs: [{ status: 'stopped', verdict: 'none' }],
  })
  const again = await installer.call('runs.start', { body: startOf('HL2690007') })
  await stop(again.id)
})

test('a sealed practice run counts for nobody', async () => {
  const run = await installer.call('runs.start', { body: startOf('HL2690008', { reason: 'practice' }) })
  const { frames, events } = buildCheck({ setup: run.setup })
  for (let from = 0; from < frames.length; from += 200)
    await sendFrames(bench, {
      run: run.id,
      from,
      frames: frames.slice(from, from + 200),
      events: events.filter((event) => event.frame >= from && event.frame < from + 200),
    })
  await ended(run.id)
  const page = await installer.call('instruments.read', { params: { serial: 'HL2690008' } })
  expect(page).toMatchObject({
    instrument: { lastVerdict: null, lastRunAt: null },
    runs: [{ status: 'sealed' }],
  })
})

test('a bench without a valid verification gives no verdict, however good the readings', async () => {
  const page = await installer.call('instruments.read', { params: { serial: 'HL2690008' } })
  const view = await installer.call('runs.read', { params: { id: page.runs[0]!.id } })
  expect(view).toMatchObject({ setup: { verified: false }, measured: { verdict: 'none' } })
  expect(view.measured.warnings).toContain('benchNotVerified')
  expect(
    view.measured.results.filter((result) => result.rule === 'balance' && result.result !== 'within'),
  ).toEqual([])
})

test(
  'a bench that stays silent leaves its run interrupted, kept as far as it came',
  { timeout: 30_000 },
  async () => {
    const run = await installer.call('runs.start', { body: startOf('HL2690009') })
    await sendFrames(bench, batchOf(run.id, 0, 120))
    await expect.poll(() => at.server.board.find(run.id), { timeout: 25_000 }).toBeUndefined()
    const view = await installer.call('runs.read', { params: { id: run.id } })
    expect(view).toMatchObject({
      status: 'interrupted',
      endReason: 'the bench fell silent',
      measured: { frames: 120 },
    })
    const trace = await installer.call('runs.trace', { params: { id: run.id } })
    expect(trace.frames).toBe(120)
    expect(await installer.call('runs.recompute', { params: { id: run.id } })).toMatchObject({
      sameBits: true,
    })
  },
)

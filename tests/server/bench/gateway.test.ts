import { randomUUID } from 'node:crypto'
import { afterAll, afterEach, beforeAll, beforeEach, expect, test } from 'vitest'
import { MAX_BATCH_FRAMES } from '../../../src/shared/contract/frames.ts'
import type { BenchHello, FramesAnswer } from '../../../src/shared/contract/frames.ts'
import type { Problem } from '../../../src/shared/contract/errors.ts'
import { batchOf, helloOf, quietFrame, sayHello, sendFrames, startOf } from '../../helpers/benchTalk.ts'
import { demoId } from '../../../db/seeds/demo.ts'
import { once, startTestServer } from '../../helpers/runningServer.ts'
import type { BenchClient, TestPerson, TestServer } from '../../helpers/runningServer.ts'

let at: TestServer
let installer: TestPerson
let lead: TestPerson
let bench: BenchClient
let run: string
let serials = 0

beforeAll(async () => {
  at = await startTestServer()
  installer = await at.signIn('installer')
  lead = await at.signIn('lead')
  await installer.call('cautions.acknowledge', { body: { id: randomUUID() } })
})

afterAll(() => at.close())

beforeEach(async () => {
  bench = at.bench(at.benchTokens.window!)
  await sayHello(bench)
  const started = await installer.call('runs.start', { body: startOf(`HL2600${100 + serials++}`) })
  run = started.id
})

afterEach(async () => {
  if (at.server.board.find(run)) await stop()
  await expect.poll(() => at.server.board.find(run)).toBeUndefined()
  bench.disconnect()
})

function codeOf(answer: FramesAnswer): string {
  return answer.ok ? 'ok' : answer.problem.code
}

function refusals(code: string): number {
  return at.server.refusals.get(code) ?? 0
}

test('a bench with a wrong token is refused before the connection stands', async () => {
  const stranger = at.bench('x'.repeat(43))
  const error = (await once(stranger, 'connect_error')) as Error & { data: Problem }
  expect(error.data.code).toBe('bench.token')
})

test('frames are taken once: repeats fall away, a gap names the frame wanted', async () => {
  expect(await sendFrames(bench, batchOf(run, 0, 20))).toEqual({
    ok: true,
    next: 20,
    committed: 0,
    window: 200,
  })
  expect(await sendFrames(bench, batchOf(run, 10, 20))).toMatchObject({ ok: true, next: 30 })
  expect(await sendFrames(bench, batchOf(run, 0, 5))).toMatchObject({ ok: true, next: 30 })
  const gap = await sendFrames(bench, batchOf(run, 40, 5))
  expect(gap).toMatchObject({ ok: false, problem: { code: 'frames.gap', facts: { next: 30 } } })
  expect(at.server.board.find(run)!.buffer.frames).toBe(30)
})

test('frames of another run, with wrong channels, or with an event outside the batch get their code', async () => {
  expect(codeOf(await sendFrames(bench, batchOf(randomUUID(), 0, 1)))).toBe('frames.foreign')
  expect(codeOf(await sendFrames(bench, { ...batchOf(run, 0, 1), frames: [quietFrame(1)] }))).toBe(
    'frames.channels',
  )
  const events = [{ kind: 'pedal', frame: 7, startTenthMs: 700, durationTenthMs: 0 }]
  expect(codeOf(await sendFrames(bench, { ...batchOf(run, 0, 2), events }))).toBe('frames.event-place')
  expect(at.server.board.find(run)!.next).toBe(0)
})

test('two batches at once: the second is refused, whatever order they are answered in', async () => {
  const answers = await Promise.all([
    sendFrames(bench, batchOf(run, 0, 50)),
    sendFrames(bench, batchOf(run, 50, 50)),
  ])
  expect(answers.map(codeOf)).toEqual(['ok', 'frames.in-flight'])
})

test('malformed messages are refused with their code and counted, with or without an answer function', async () => {
  const broken: unknown[] = [null, 5, 'frames', [], {}, { run }, { ...batchOf(run, 0, 1), from: -1 }]
  for (const message of broken) {
    const before = refusals('protocol.message')
    expect(codeOf(await sendFrames(bench, message))).toBe('protocol.message')
    expect(refusals('protocol.message')).toBe(before + 1)
  }
  const refused = once(bench, 'bench:refused')
  ;(bench as unknown as { emit: (name: string, body: unknown) => void }).emit('bench:frames', { run: 7 })
  expect(await refused).toMatchObject({ code: 'protocol.message' })
  expect(await sendFrames(bench, batchOf(run, 0, 1))).toMatchObject({ ok: true, next: 1 })
})

test('a batch beyond the window is refused by name', async () => {
  expect(codeOf(await sendFrames(bench, batchOf(run, 0, MAX_BATCH_FRAMES + 1)))).toBe('frames.window')
  expect(codeOf(await sendFrames(bench, batchOf(run, 0, MAX_BATCH_FRAMES)))).toBe('ok')
})

test('a message of unknown name is refused', async () => {
  const answer = (await (bench as unknown as { emitWithAck: (name: string) => Promise<unknown> }).emitWithAck(
    'bench:dance',
  )) as FramesAnswer
  expect(codeOf(answer)).toBe('protocol.unknown-event')
})

test('insulation with more than 5 V is refused by name', async () => {
  const event = { kind: 'insulation', frame: 0, startTenthMs: 0, durationTenthMs: 0, kiloOhm: 100 }
  const send = (testMillivolt: number) =>
    sendFrames(bench, { ...batchOf(run, 0, 1), events: [{ ...event, testMillivolt }] })
  expect(codeOf(await send(500_000))).toBe('measure.high-voltage')
  expect(codeOf(await send(5000))).toBe('ok')
})

test('frames before hello are refused', async () => {
  const door = at.bench(at.benchTokens.door!)
  expect(codeOf(await sendFrames(door, batchOf(run, 0, 1)))).toBe('protocol.hello-first')
})

test('another protocol version is refused', async () => {
  const door = at.bench(at.benchTokens.door!)
  expect(await sayHello(door, { protocolVersion: 2 })).toMatchObject({
    ok: false,
    problem: { code: 'protocol.version', facts: { spoken: 1 } },
  })
})

test('the newest connection of a bench wins; the older one is told and ended', async () => {
  const told = once(bench, 'bench:replaced')
  const ended = once(bench, 'disconnect')
  const newer = at.bench(at.benchTokens.window!)
  const hello = await sayHello(newer, { holding: { run, from: 0 } })
  expect(await told).toMatchObject({ code: 'bench.replaced' })
  await ended
  expect(hello).toMatchObject({ ok: true, order: { run, from: 0 } })
  expect(await sendFrames(newer, batchOf(run, 0, 3))).toMatchObject({ ok: true, next: 3 })
})

test('a second run on the same bench, or of the same serial, is refused with who and where', async () => {
  const view = await installer.call('runs.read', { params: { id: run } })
  const onBench = installer.call('runs.start', { body: startOf('HL2609999') })
  await expect(onBench).rejects.toMatchObject({
    problem: {
      code: 'bench.busy',
      status: 409,
      facts: { runId: run, bench: 'Window', person: 'Ines Marlowe' },
    },
  })
  const door = at.bench(at.benchTokens.door!)
  await sayHello(door, { channelKind: 'one' })
  const doorId = (await installer.call('benches.list')).items.find((item) => item.name === 'Door')!.id
  const ofSerial = installer.call('runs.start', { body: startOf(view.serial, { benchId: doorId }) })
  await expect(ofSerial).rejects.toMatchObject({
    problem: { code: 'run.serial-busy', facts: { runId: run, serial: view.serial } },
  })
})

test('starting the same run again gives the same run', async () => {
  const view = await installer.call('runs.read', { params: { id: run } })
  const again = await installer.call('runs.start', { body: startOf(view.serial, { id: run }) })
  expect(again).toMatchObject({ id: run, openedAt: view.openedAt })
})

test('a restarted server wants the frames that were not committed, and keeps what people did', async () => {
  await sendFrames(bench, batchOf(run, 0, 100))
  const action = {
    id: randomUUID(),
    action: {
      kind: 'enterValue',
      rule: 'contactTip',
      stringNo: null,
      value: 0.02,
      u: 0.002,
      meter: 'milliohm meter 3',
    },
  }
  const acted = await installer.call('runs.act', { params: { id: run }, body: action })
  expect(acted.measured.entered).toMatchObject([{ rule: 'contactTip', value: 0.02 }])
  await at.restart()
  bench = at.bench(at.benchTokens.window!)
  expect(await sayHello(bench)).toMatchObject({ ok: true, order: { run, from: 0 } })
  await sendFrames(bench, batchOf(run, 0, 120))
  const view = await installer.call('runs.read', { params: { id: run } })
  expect(view.measured.frames).toBe(120)
  expect(view.actions).toMatchObject([{ id: action.id, frame: 100 }])
  expect(view.measured.entered).toMatchObject([{ rule: 'contactTip', value: 0.02 }])
})

test('a connection that takes over is told what the person is asked to do', async () => {
  const newer = at.bench(at.benchTokens.window!)
  const first = once(newer, 'run:prompt')
  await sayHello(newer)
  const prompt = await first
  expect(prompt).toMatchObject({ run })
  const newest = at.bench(at.benchTokens.window!)
  const again = once(newest, 'run:prompt')
  await sayHello(newest)
  expect(await again).toEqual(prompt)
})

const otherSetups: [string, Partial<BenchHello>][] = [
  ['channelKind', { channelKind: 'one' }],
  ['frameMs', { frameMs: 5 }],
  ['mainsHz', { mainsHz: 60 }],
  ['capabilities', { capabilities: ['sixLevels'] }],
  ['algorithms', { algorithms: { test: '2' } }],
  ['frameMs, mainsHz', { frameMs: 5, mainsHz: 60 }],
]

test.each(otherSetups)('a bench with other %s may not go on with a run', async (differs, more) => {
  await sendFrames(bench, batchOf(run, 0, 10))
  const hello = await sayHello(bench, { ...more, holding: { run, from: 0 } })
  expect(hello).toMatchObject({ ok: false, problem: { code: 'bench.differs', facts: { run, differs } } })
  expect(codeOf(await sendFrames(bench, batchOf(run, 10, 5)))).toBe('protocol.hello-first')
  expect(at.server.board.find(run)!.next).toBe(10)
  const window = (await installer.call('benches.list')).items.find((item) => item.name === 'Window')!
  expect(window).toMatchObject({ connected: false, channelKind: 'six' })
})

test('a bench that can do more than when the run began goes on with it', async () => {
  const { capabilities } = helloOf()
  expect(await sayHello(bench, { capabilities: [...capabilities, 'pedal'] })).toMatchObject({
    ok: true,
    order: { run },
  })
  expect(codeOf(await sendFrames(bench, batchOf(run, 0, 5)))).toBe('ok')
})

async function stop(): Promise<void> {
  await lead.call('runs.act', {
    params: { id: run },
    body: { id: randomUUID(), action: { kind: 'stop', reason: 'enough' } },
  })
}

test('a bench that was away when its run ended is told so at its hello', async () => {
  await sendFrames(bench, batchOf(run, 0, 10))
  bench.disconnect()
  await stop()
  await expect.poll(() => at.server.board.find(run)).toBeUndefined()
  const back = at.bench(at.benchTokens.window!)
  const ended = once(back, 'run:ended')
  expect(await sayHello(back, { holding: { run, from: 0 } })).toMatchObject({ ok: true, order: null })
  expect(await ended).toEqual({ run, outcome: 'stopped', verdict: 'none' })
})

test('a bench that sends frames of a run that has ended is told so', async () => {
  await stop()
  await expect.poll(() => at.server.board.find(run)).toBeUndefined()
  const ended = once(bench, 'run:ended')
  expect(codeOf(await sendFrames(bench, batchOf(run, 0, 5)))).toBe('run.not-open')
  expect(await ended).toMatchObject({ run, outcome: 'stopped' })
})

test('a hello while the run is judged and not stored brings neither an order nor its end', async () => {
  const open = at.server.board.find(run)!
  let store: () => void = () => undefined
  const stored = new Promise<void>((resolve) => (store = resolve))
  void open.storing.add(() => stored)
  await stop()
  const messages: string[] = []
  bench.onAny((event: string) => messages.push(event))
  expect(await sayHello(bench, { holding: { run, from: 0 } })).toMatchObject({ ok: true, order: null })
  expect(codeOf(await sendFrames(bench, batchOf(run, 0, 5)))).toBe('run.not-open')
  expect(messages).not.toContain('run:ended')
  const ended = once(bench, 'run:ended')
  store()
  expect(await ended).toMatchObject({ run, outcome: 'stopped' })
})

test.each([undefined, null, 'yes', {}, { ok: false }, { ok: false, problem: { code: 'nonsense' } }])(
  'a simulated bench that answers %j counts as offline',
  async (answer) => {
    bench.on('bench:simulate', (_, reply) => reply(answer as never))
    const command = installer.call('benches.simulate', {
      params: { id: demoId('bench window') },
      body: { kind: 'damp' },
    })
    await expect(command).rejects.toMatchObject({ problem: { code: 'bench.offline' } })
  },
)

import { randomUUID } from 'node:crypto'
import { afterAll, afterEach, beforeAll, beforeEach, expect, test } from 'vitest'
import type { LiveLevels } from '../../../src/shared/contract/live.ts'
import type { Problem } from '../../../src/shared/contract/errors.ts'
import type { RunView } from '../../../src/shared/contract/runs.ts'
import { batchOf, sayHello, sendFrames, startOf } from '../../helpers/benchTalk.ts'
import { once, startTestServer } from '../../helpers/runningServer.ts'
import type { BenchClient, TestPerson, TestServer } from '../../helpers/runningServer.ts'

let at: TestServer
let installer: TestPerson
let bench: BenchClient
let run: string
let serials = 0

beforeAll(async () => {
  at = await startTestServer()
  installer = await at.signIn('installer')
  await installer.call('cautions.acknowledge', { body: { id: randomUUID() } })
})

afterAll(() => at.close())

beforeEach(async () => {
  bench = at.bench(at.benchTokens.window!)
  await sayHello(bench)
  run = (await installer.call('runs.start', { body: startOf(`HL2610${100 + serials++}`) })).id
})

afterEach(async () => {
  const body = { id: randomUUID(), action: { kind: 'stop', reason: 'test over' } }
  if (at.server.board.find(run)) await installer.call('runs.act', { params: { id: run }, body })
  await expect.poll(() => at.server.board.find(run)).toBeUndefined()
  bench.disconnect()
})

test('a screen without a sign-in, or from another site, is refused', async () => {
  const nobody = at.screen({ ...installer, cookie: '' })
  expect(((await once(nobody, 'connect_error')) as Error & { data: Problem }).data.code).toBe(
    'sign-in.required',
  )
  const { io } = await import('socket.io-client')
  const foreign = io(`${at.url}/live`, {
    transports: ['websocket'],
    forceNew: true,
    reconnection: false,
    extraHeaders: { cookie: installer.cookie, origin: 'http://elsewhere.test' },
  })
  const error = await new Promise<Error & { data: Problem }>((resolve) =>
    foreign.once('connect_error', (e) => resolve(e as Error & { data: Problem })),
  )
  expect(error.data.code).toBe('request.origin')
})

test('a screen that joins late gets the whole state first, then thinned levels', async () => {
  await sendFrames(bench, batchOf(run, 0, 40))
  const screen = at.screen(installer)
  const answer = await screen.emitWithAck('watch:run', { run })
  expect(answer).toMatchObject({ ok: true, view: { id: run, status: 'open', measured: { frames: 40 } } })
  const seen: LiveLevels[] = []
  screen.on('run:levels', (levels) => seen.push(levels))
  // Updates are thinned by the clock, so frames are sent until one is due.
  for (let from = 40; seen.length === 0; from += 10) await sendFrames(bench, batchOf(run, from, 10))
  expect(seen[0]).toMatchObject({ run, jackMdb: -88_000, plugged: true })
  expect(seen[0]!.frame).toBeGreaterThanOrEqual(49)
})

test('the end of a run reaches the screen as stored', async () => {
  const screen = at.screen(installer)
  await screen.emitWithAck('watch:run', { run })
  const views: RunView[] = []
  screen.on('run:view', (view) => views.push(view))
  const body = { id: randomUUID(), action: { kind: 'stop', reason: 'string broke' } }
  await installer.call('runs.act', { params: { id: run }, body })
  await expect
    .poll(() => views.at(-1))
    .toMatchObject({ status: 'stopped', storage: 'stored', endReason: 'string broke' })
  const stored = await installer.call('runs.read', { params: { id: run } })
  expect(stored).toMatchObject({
    status: 'stopped',
    storage: 'stored',
    measured: { verdict: 'none', phase: 'stopped' },
  })
})

test('sign-out ends the sockets of that sign-in at once, and of no other', async () => {
  const other = await at.signIn('installer')
  const mine = at.screen(other)
  const kept = at.screen(installer)
  await mine.emitWithAck('watch:run', { run })
  await kept.emitWithAck('watch:run', { run })
  const told = once(mine, 'session:ended')
  const cut = once(mine, 'disconnect')
  await other.call('auth.signOut', { body: { everywhere: false } })
  expect(await told).toMatchObject({ code: 'sign-in.required' })
  await cut
  expect(kept.connected).toBe(true)
})

test('a screen is told when a bench comes and goes', async () => {
  const screen = at.screen(installer)
  const answer = await screen.emitWithAck('watch:benches', {})
  expect(answer.ok && answer.benches.find((item) => item.name === 'Door')?.connected).toBe(false)
  const came = once(screen, 'bench:view')
  const door = at.bench(at.benchTokens.door!)
  await sayHello(door, { channelKind: 'one' })
  expect(await came).toMatchObject({ name: 'Door', connected: true, channelKind: 'one' })
  const went = once(screen, 'bench:view')
  door.disconnect()
  expect(await went).toMatchObject({ name: 'Door', connected: false })
})

test('malformed messages of a screen are refused with a code', async () => {
  const screen = at.screen(installer) as unknown as {
    emitWithAck: (name: string, body?: unknown) => Promise<unknown>
  }
  expect(await screen.emitWithAck('watch:run', { run: 'x' })).toMatchObject({
    ok: false,
    problem: { code: 'protocol.message' },
  })
  expect(await screen.emitWithAck('watch:run', { run: randomUUID() })).toMatchObject({
    ok: false,
    problem: { code: 'run.unknown' },
  })
  expect(await screen.emitWithAck('watch:everything')).toMatchObject({
    ok: false,
    problem: { code: 'protocol.unknown-event' },
  })
})

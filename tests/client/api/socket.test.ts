import { afterEach, beforeEach, expect, test, vi } from 'vitest'
import { createLive } from '../../../src/api/socket.ts'
import type { Live, LiveSocket } from '../../../src/api/socket.ts'
import type { RunView } from '../../../src/shared/contract/runs.ts'
import { liveAt } from '../../fixtures/runViews.ts'

type Handler = (...args: unknown[]) => void

/** A socket that does what the test says. */
function fakeSocket() {
  const handlers = new Map<string, Handler>()
  const emitted: { event: string; message: unknown; answer: Handler }[] = []
  const socket = {
    connected: false,
    active: true,
    on: (event: string, handler: Handler) => handlers.set(event, handler),
    emit: (event: string, message: unknown, answer: Handler) => emitted.push({ event, message, answer }),
    timeout: () => socket,
    connect: vi.fn(),
    disconnect: vi.fn(() => {
      socket.connected = false
    }),
  }
  const fire = (event: string, ...args: unknown[]) => handlers.get(event)?.(...args)
  return {
    socket: socket as unknown as LiveSocket,
    connect: socket.connect,
    emitted,
    fire,
    up: () => {
      socket.connected = true
      fire('connect')
    },
    /** `active` false: the server closed or refused, and socket.io will not try again by itself */
    down: (active = true) => {
      socket.connected = false
      socket.active = active
      fire('disconnect', active ? 'transport close' : 'io server disconnect')
    },
  }
}

const VIEW: RunView = liveAt('noise')
let fake: ReturnType<typeof fakeSocket>
let live: Live
let online: boolean
const ensureFresh = vi.fn<() => Promise<boolean>>()

beforeEach(() => {
  vi.useFakeTimers()
  online = true
  ensureFresh.mockReset().mockResolvedValue(true)
  fake = fakeSocket()
  live = createLive({ open: () => fake.socket, ensureFresh, now: () => 1000, isOnline: () => online })
})
afterEach(() => {
  vi.useRealTimers()
})

test('the state follows the connection', () => {
  expect(live.state.value).toBe('off')
  live.connect()
  expect(live.state.value).toBe('connecting')
  fake.up()
  expect(live.state.value).toBe('connected')
  fake.down()
  expect(live.state.value).toBe('reconnecting')
  expect(live.lostAt.value).toBe(1000)
  fake.up()
  expect(live.state.value).toBe('connected')
  expect(live.lostAt.value).toBeNull()
})

test('the state is offline at once without a network, and after a while with one', () => {
  live.connect()
  fake.up()
  fake.down()
  vi.advanceTimersByTime(10_000)
  expect(live.state.value).toBe('offline')
  fake.up()
  online = false
  fake.down()
  expect(live.state.value).toBe('offline')
})

test('watchRun() joins when the connection is there and again after each reconnect', () => {
  const onView = vi.fn()
  live.watchRun(VIEW.id, { onView })
  live.connect()
  expect(fake.emitted).toEqual([])
  fake.up()
  fake.down()
  fake.up()
  expect(fake.emitted.map(({ event, message }) => [event, message])).toEqual([
    ['watch:run', { run: VIEW.id }],
    ['watch:run', { run: VIEW.id }],
  ])
  fake.emitted[1]!.answer(null, { ok: true, view: VIEW })
  expect(onView).toHaveBeenCalledExactlyOnceWith(VIEW)
})

test('watchRun() gives only what belongs to its run', () => {
  const onView = vi.fn()
  const onLevels = vi.fn()
  live.watchRun(VIEW.id, { onView, onLevels })
  live.connect()
  fake.up()
  const levels = {
    run: VIEW.id,
    frame: 10,
    levelMdb: [-21_900],
    jackMdb: -30_000,
    plugged: true,
    ringSleeveClosed: true,
    tipClosed: null,
  }
  fake.fire('run:levels', levels)
  fake.fire('run:levels', { ...levels, run: '99999999-5e6f-4071-8293-a4b5c6d7e8f9' })
  fake.fire('run:view', { ...VIEW, id: '99999999-5e6f-4071-8293-a4b5c6d7e8f9' })
  expect(onLevels).toHaveBeenCalledExactlyOnceWith(levels)
  expect(onView).not.toHaveBeenCalled()
})

test('watchRun() leaves the room when the last watcher goes', () => {
  live.connect()
  fake.up()
  const stopOne = live.watchRun(VIEW.id, { onView: vi.fn() })
  const stopTwo = live.watchRun(VIEW.id, { onView: vi.fn() })
  stopOne()
  expect(fake.emitted.filter(({ event }) => event === 'unwatch:run')).toHaveLength(0)
  stopTwo()
  stopTwo()
  expect(fake.emitted.filter(({ event }) => event === 'unwatch:run')).toHaveLength(1)
  const before = fake.emitted.length
  fake.down()
  fake.up()
  expect(fake.emitted).toHaveLength(before)
})

test('watchRun() passes a refusal on, and asks again when no answer came', () => {
  const onProblem = vi.fn()
  live.connect()
  fake.up()
  live.watchRun(VIEW.id, { onView: vi.fn(), onProblem })
  fake.emitted[0]!.answer(new Error('operation has timed out'))
  expect(fake.emitted).toHaveLength(2)
  const problem = { type: '', code: 'run.unknown', title: 't', remedy: 'r', status: 404 }
  fake.emitted[1]!.answer(null, { ok: false, problem })
  expect(onProblem).toHaveBeenCalledExactlyOnceWith(expect.objectContaining({ code: 'run.unknown' }))
})

test('a message that is not understood is reported, never thrown', () => {
  const onProblem = vi.fn()
  live.watchRun(VIEW.id, { onView: vi.fn(), onProblem })
  live.connect()
  fake.up()
  fake.fire('run:view', { id: VIEW.id })
  expect(onProblem).toHaveBeenCalledExactlyOnceWith(expect.objectContaining({ code: 'client.answer' }))
})

test('a connection that the server closed is opened again with a fresh sign-in', async () => {
  live.connect()
  fake.up()
  fake.connect.mockClear()
  fake.down(false)
  await vi.advanceTimersByTimeAsync(2000)
  expect(ensureFresh).toHaveBeenCalledOnce()
  expect(fake.connect).toHaveBeenCalledOnce()
})

test('a connection is not opened again once the sign-in has ended', async () => {
  const ended = vi.fn()
  live.onSessionEnded(ended)
  live.connect()
  fake.up()
  fake.connect.mockClear()
  fake.fire('session:ended', { type: '', code: 'sign-in.required', title: 't', remedy: 'r', status: 401 })
  fake.down(false)
  await vi.advanceTimersByTimeAsync(60_000)
  expect(ended).toHaveBeenCalledExactlyOnceWith(expect.objectContaining({ code: 'sign-in.required' }))
  expect(fake.connect).not.toHaveBeenCalled()
  expect(live.state.value).toBe('off')
})

import { createPinia, setActivePinia } from 'pinia'
import { afterEach, beforeEach, describe, expect, test, vi } from 'vitest'
import { ApiProblem } from '../../../src/api/apiProblem.ts'
import { ERRORS, type ErrorCode } from '../../../src/shared/contract/errors.ts'
import type { RunActionBody } from '../../../src/shared/contract/runs.ts'
import { useLiveStore } from '../../../src/stores/live.ts'
import { useRunActionsStore } from '../../../src/stores/runActions.ts'
import { liveAt } from '../../fixtures/runViews.ts'

const server = vi.hoisted(() => ({
  api: vi.fn<(key: string, parts: { body: { id: string; action: unknown } }) => Promise<unknown>>(),
}))
vi.mock('../../../src/api/http.ts', () => ({ api: server.api }))
vi.mock('../../../src/api/socket.ts', async () => {
  const { ref, shallowRef } = await import('vue')
  return { live: { state: ref('connected'), lostAt: shallowRef(null), watchRun: () => () => undefined } }
})

const refused = (code: ErrorCode, status: number) =>
  new ApiProblem({ type: `/problems/${code}`, code, status, ...ERRORS[code] })
const offline = () => new ApiProblem('client.offline')
const sent = () => server.api.mock.calls.map(([, parts]) => parts.body)
const kinds = () => sent().map((body) => (body.action as RunActionBody).kind)

const view = liveAt('strings')
const REPEAT: RunActionBody = { kind: 'repeatString', stringNo: 5, reason: 'plucked unevenly' }
const GO_ON: RunActionBody = { kind: 'goOn' }

beforeEach(() => {
  vi.useFakeTimers()
  setActivePinia(createPinia())
  server.api.mockReset()
  useLiveStore().watch(view.id)
  useLiveStore().accept(view)
})
afterEach(() => {
  vi.useRealTimers()
})

describe('useRunActionsStore()', () => {
  test('sends an action once and takes the state of the answer', async () => {
    server.api.mockResolvedValue(liveAt('wiggle'))
    expect(await useRunActionsStore().act(view.id, GO_ON)).toBe(true)
    expect(sent()).toHaveLength(1)
    expect(useLiveStore().run!.measured.phase).toBe('wiggle')
  })

  test('tries again with the same id until the server is back, and says so', async () => {
    server.api
      .mockRejectedValueOnce(offline())
      .mockRejectedValueOnce(refused('storage.away', 503))
      .mockRejectedValueOnce(refused('server.error', 500))
      .mockResolvedValue(view)
    const actions = useRunActionsStore()
    const done = actions.act(view.id, REPEAT)
    await vi.advanceTimersByTimeAsync(1)
    expect(actions.isRetrying).toBe(true)
    await vi.advanceTimersByTimeAsync(10_000)
    expect(await done).toBe(true)
    expect(new Set(sent().map((body) => body.id)).size).toBe(1)
    expect(sent()).toHaveLength(4)
    expect(actions.isRetrying).toBe(false)
    expect(actions.queue).toEqual([])
  })

  test('does not try again what was refused', async () => {
    server.api.mockRejectedValue(refused('run.action-not-now', 409))
    const actions = useRunActionsStore()
    expect(await actions.act(view.id, GO_ON)).toBe(false)
    expect(sent()).toHaveLength(1)
    expect(actions.refusal!.problem.code).toBe('run.action-not-now')
  })

  test('keeps the order in which things were done, each with its own id', async () => {
    server.api.mockRejectedValueOnce(offline()).mockResolvedValue(view)
    const actions = useRunActionsStore()
    const both = Promise.all([actions.act(view.id, REPEAT), actions.act(view.id, GO_ON)])
    await vi.advanceTimersByTimeAsync(1000)
    expect(await both).toEqual([true, true])
    expect(kinds()).toEqual(['repeatString', 'repeatString', 'goOn'])
    expect(sent()[2]!.id).not.toBe(sent()[0]!.id)
  })

  test('drops a key press that could not be sent while its step lasted', async () => {
    server.api.mockRejectedValue(offline())
    const actions = useRunActionsStore()
    const done = actions.act(view.id, GO_ON)
    await vi.advanceTimersByTimeAsync(200)
    useLiveStore().accept(liveAt('wiggleReady'))
    await vi.advanceTimersByTimeAsync(1000)
    expect(await done).toBe(false)
    expect(actions.expired).toEqual(GO_ON)
    const triedBefore = sent().length
    await vi.advanceTimersByTimeAsync(20_000)
    expect(sent()).toHaveLength(triedBefore)
  })

  test('drops a key press after five seconds, but never a reason or a reading', async () => {
    server.api.mockRejectedValue(offline())
    const actions = useRunActionsStore()
    const key = actions.act(view.id, GO_ON)
    await vi.advanceTimersByTimeAsync(8000)
    expect(await key).toBe(false)
    server.api.mockClear()
    const reason = actions.act(view.id, REPEAT)
    await vi.advanceTimersByTimeAsync(60_000)
    expect(actions.queue).toHaveLength(1)
    server.api.mockResolvedValue(view)
    await vi.advanceTimersByTimeAsync(3000)
    expect(await reason).toBe(true)
  })
})

import { createPinia, setActivePinia } from 'pinia'
import { beforeEach, describe, expect, test, vi } from 'vitest'
import type { RunHandlers } from '../../../src/api/socket.ts'
import { useLiveStore } from '../../../src/stores/live.ts'
import { IDS } from '../../fixtures/runParts.ts'
import { judgedNotStored, liveAt, liveWithLowString, sealedPass } from '../../fixtures/runViews.ts'

const socket = vi.hoisted(() => ({ handlers: new Map<string, unknown>(), left: [] as string[] }))
vi.mock('../../../src/api/socket.ts', async () => {
  const { ref, shallowRef } = await import('vue')
  return {
    live: {
      state: ref('connected'),
      lostAt: shallowRef(null),
      watchRun: (run: string, handlers: unknown) => {
        socket.handlers.set(run, handlers)
        return () => socket.left.push(run)
      },
    },
  }
})
const handlersOf = (run: string) => socket.handlers.get(run) as Required<RunHandlers>

const view = liveAt('strings')
const levels = (frame: number) => ({
  run: view.id,
  frame,
  levelMdb: [-20_000, -90_000, -90_000, -90_000, -90_000, -90_000],
  jackMdb: -20_000,
  plugged: true,
  ringSleeveClosed: true,
  tipClosed: true,
})

beforeEach(() => {
  setActivePinia(createPinia())
  socket.handlers.clear()
  socket.left.length = 0
})

describe('useLiveStore()', () => {
  test('takes the whole state, levels and plucks of the run it watches', () => {
    const live = useLiveStore()
    live.watch(view.id)
    handlersOf(view.id).onView(view)
    handlersOf(view.id).onLevels(levels(2700))
    const pluck = liveWithLowString().measured.plucks.at(-1)!
    handlersOf(view.id).onPluck({ run: view.id, stringNo: 4, pluck })
    expect(live.run).toEqual(view)
    expect(live.columns()[1]).toEqual([-20])
    expect(live.lastPluck).toMatchObject({ stringNo: 4, count: 1, pluck: { dropped: 'notDamped' } })
  })

  test('leaves the room and forgets the run when another is watched', () => {
    const live = useLiveStore()
    live.watch(view.id)
    handlersOf(view.id).onView(view)
    live.watch(IDS.action)
    expect(socket.left).toEqual([view.id])
    expect(live.run).toBeNull()
    expect(live.columns()).toEqual([[]])
  })

  test('watches one run once', () => {
    const live = useLiveStore()
    live.watch(view.id)
    handlersOf(view.id).onView(view)
    live.watch(view.id)
    expect(socket.left).toEqual([])
    expect(live.run).toEqual(view)
  })

  test('accept() keeps the newer state when an answer comes late', () => {
    const live = useLiveStore()
    live.watch(view.id)
    handlersOf(view.id).onView(liveAt('wiggle'))
    live.accept(view)
    expect(live.run!.measured.phase).toBe('wiggle')
    live.accept(sealedPass())
    expect(live.run!.status).toBe('sealed')
    live.accept(judgedNotStored())
    expect(live.run!.storage).toBe('stored')
  })

  test('accept() ignores an answer about a run that is not watched any more', () => {
    const live = useLiveStore()
    live.watch(IDS.action)
    live.accept(view)
    expect(live.run).toBeNull()
    live.watch(view.id)
    live.accept(view)
    expect(live.run).toEqual(view)
    live.unwatch()
    live.accept(view)
    expect(live.run).toBeNull()
  })

  test('a state from the socket always counts: after a restart the server knows fewer frames', () => {
    const live = useLiveStore()
    live.watch(view.id)
    handlersOf(view.id).onView(liveAt('wiggle'))
    handlersOf(view.id).onView(view)
    expect(live.run!.measured.phase).toBe('strings')
  })
})

import { io } from 'socket.io-client'
import type { Socket } from 'socket.io-client'
import { ref, shallowRef } from 'vue'
import type { Ref } from 'vue'
import { Problem } from '../shared/contract/errors.ts'
import { LIVE_NAMESPACE, LiveLevels, LivePluck } from '../shared/contract/live.ts'
import type { LiveAnswer, ScreenToServer, ServerToScreen } from '../shared/contract/live.ts'
import { RunView } from '../shared/contract/runs.ts'
import { BenchView } from '../shared/contract/workshop.ts'
import { ApiProblem } from './apiProblem.ts'
import { http } from './http.ts'

/**
 * off: nobody is signed in. connecting: the first time. reconnecting: was there, is being sought again.
 * offline: the browser itself has no network, or the search has lasted for a while.
 */
export type LiveState = 'off' | 'connecting' | 'connected' | 'reconnecting' | 'offline'

export interface RunHandlers {
  /** the whole state: with the answer to joining, after every reconnect, after every change */
  onView: (view: RunView) => void
  onPluck?: (pluck: LivePluck) => void
  onLevels?: (levels: LiveLevels) => void
  /** joining was refused, or a message was not understood */
  onProblem?: (problem: ApiProblem) => void
}

export interface BenchesHandlers {
  /** all of them: with the answer to joining and after every reconnect */
  onBenches: (benches: BenchView[]) => void
  onBench: (bench: BenchView) => void
  onProblem?: (problem: ApiProblem) => void
}

export interface Live {
  state: Readonly<Ref<LiveState>>
  /** when the connection was lost, by the browser's clock; null while it stands */
  lostAt: Readonly<Ref<number | null>>
  connect: () => void
  disconnect: () => void
  /** Joins the run's room now and after every reconnect, until the function it gives is called. */
  watchRun: (run: string, handlers: RunHandlers) => () => void
  watchBenches: (handlers: BenchesHandlers) => () => void
  onSessionEnded: (listener: (problem: ApiProblem) => void) => () => void
}

export type LiveSocket = Pick<
  Socket<ServerToScreen, ScreenToServer>,
  'on' | 'emit' | 'connect' | 'disconnect' | 'connected' | 'active' | 'timeout'
>

const ANSWER_TIMEOUT_MS = 5000
const OFFLINE_AFTER_MS = 10_000
const RETRY_MS = 2000

export interface LiveDeps {
  open: () => LiveSocket
  ensureFresh: () => Promise<boolean>
  now: () => number
  isOnline: () => boolean
}

/** Builds the live connection; the socket is handed in, so that a test can fake it. */
export function createLive(deps: LiveDeps): Live {
  const state = ref<LiveState>('off')
  const lostAt = shallowRef<number | null>(null)
  const runs = new Map<string, Set<RunHandlers>>()
  const benches = new Set<BenchesHandlers>()
  const endedListeners = new Set<(problem: ApiProblem) => void>()
  let socket: LiveSocket | null = null
  let wanted = false
  let retryTimer: ReturnType<typeof setTimeout> | undefined
  let offlineTimer: ReturnType<typeof setTimeout> | undefined

  function lost(): void {
    if (!wanted) return
    lostAt.value ??= deps.now()
    state.value = !deps.isOnline() ? 'offline' : state.value === 'connecting' ? 'connecting' : 'reconnecting'
    offlineTimer ??= setTimeout(() => {
      if (wanted && !socket?.connected) state.value = 'offline'
    }, OFFLINE_AFTER_MS)
  }

  /** The server refused or closed: socket.io leaves trying again to us, and the token may be the reason. */
  function retryLater(): void {
    clearTimeout(retryTimer)
    retryTimer = setTimeout(() => void retry(), RETRY_MS)
  }

  async function retry(): Promise<void> {
    if (!wanted || !socket || socket.connected) return
    try {
      if (!(await deps.ensureFresh())) return
    } catch {
      // No network for the refresh either: the next try finds out.
      retryLater()
      return
    }
    if (wanted) socket.connect()
  }

  function opened(): LiveSocket {
    const opening = deps.open()
    opening.on('connect', () => {
      clearTimeout(offlineTimer)
      offlineTimer = undefined
      lostAt.value = null
      state.value = 'connected'
      for (const run of runs.keys()) joinRun(run)
      if (benches.size > 0) joinBenches()
    })
    opening.on('disconnect', () => {
      lost()
      if (!opening.active) retryLater()
    })
    opening.on('connect_error', () => {
      lost()
      if (!opening.active) retryLater()
    })
    opening.on('run:view', (message) => {
      const view = RunView.safeParse(message)
      if (view.success) toRun(view.data.id, (handlers) => handlers.onView(view.data))
      else notUnderstood(runs.values(), view.error)
    })
    opening.on('run:pluck', (message) => {
      const pluck = LivePluck.safeParse(message)
      if (pluck.success) toRun(pluck.data.run, (handlers) => handlers.onPluck?.(pluck.data))
      else notUnderstood(runs.values(), pluck.error)
    })
    opening.on('run:levels', (message) => {
      const levels = LiveLevels.safeParse(message)
      if (levels.success) toRun(levels.data.run, (handlers) => handlers.onLevels?.(levels.data))
    })
    opening.on('bench:view', (message) => {
      const bench = BenchView.safeParse(message)
      if (bench.success) for (const handlers of benches) handlers.onBench(bench.data)
      else notUnderstood([benches], bench.error)
    })
    opening.on('session:ended', (message) => {
      disconnect()
      for (const listener of endedListeners) listener(problemFrom(message))
    })
    return opening
  }

  function toRun(run: string, give: (handlers: RunHandlers) => void): void {
    for (const handlers of runs.get(run) ?? []) give(handlers)
  }

  function joinRun(run: string): void {
    socket?.timeout(ANSWER_TIMEOUT_MS).emit('watch:run', { run }, (error, answer) => {
      if (error) return retryJoin(() => runs.has(run) && joinRun(run))
      const view = viewOf(answer, (ok) => RunView.safeParse(ok.view))
      toRun(run, (handlers) =>
        view instanceof ApiProblem ? handlers.onProblem?.(view) : handlers.onView(view),
      )
    })
  }

  function joinBenches(): void {
    socket?.timeout(ANSWER_TIMEOUT_MS).emit('watch:benches', {}, (error, answer) => {
      if (error) return retryJoin(() => benches.size > 0 && joinBenches())
      const views = viewOf(answer, (ok) => BenchView.array().safeParse(ok.benches))
      for (const handlers of benches) {
        if (views instanceof ApiProblem) handlers.onProblem?.(views)
        else handlers.onBenches(views)
      }
    })
  }

  /** No answer in time while the connection stands: ask again; a broken one joins when it is back. */
  function retryJoin(join: () => void): void {
    if (socket?.connected) join()
  }

  function connect(): void {
    wanted = true
    if (socket?.connected) return
    state.value = 'connecting'
    socket ??= opened()
    socket.connect()
  }

  function disconnect(): void {
    wanted = false
    clearTimeout(retryTimer)
    clearTimeout(offlineTimer)
    offlineTimer = undefined
    socket?.disconnect()
    lostAt.value = null
    state.value = 'off'
  }

  function watchRun(run: string, handlers: RunHandlers): () => void {
    const watching = runs.get(run) ?? new Set()
    watching.add(handlers)
    runs.set(run, watching)
    if (socket?.connected) joinRun(run)
    return () => {
      watching.delete(handlers)
      if (watching.size > 0 || runs.get(run) !== watching) return
      runs.delete(run)
      if (socket?.connected) socket.emit('unwatch:run', { run }, () => undefined)
    }
  }

  function watchBenches(handlers: BenchesHandlers): () => void {
    benches.add(handlers)
    if (socket?.connected) joinBenches()
    return () => benches.delete(handlers)
  }

  return {
    state,
    lostAt,
    connect,
    disconnect,
    watchRun,
    watchBenches,
    onSessionEnded(listener) {
      endedListeners.add(listener)
      return () => endedListeners.delete(listener)
    },
  }
}

type Parsed<T> = { success: true; data: T } | { success: false; error: unknown }

function viewOf<A extends object, T>(answer: LiveAnswer<A>, parse: (ok: A) => Parsed<T>): T | ApiProblem {
  if (!answer.ok) return problemFrom(answer.problem)
  const parsed = parse(answer)
  return parsed.success ? parsed.data : new ApiProblem('client.answer', { cause: parsed.error })
}

function problemFrom(value: unknown): ApiProblem {
  const problem = Problem.safeParse(value)
  return new ApiProblem(problem.success ? problem.data : 'client.answer')
}

function notUnderstood(
  groups: Iterable<Iterable<{ onProblem?: (problem: ApiProblem) => void }>>,
  cause: unknown,
): void {
  const problem = new ApiProblem('client.answer', { cause })
  for (const group of groups) for (const handlers of group) handlers.onProblem?.(problem)
}

export const live = createLive({
  open: () =>
    io(LIVE_NAMESPACE, {
      transports: ['websocket'],
      withCredentials: true,
      autoConnect: false,
      reconnectionDelay: 300,
      reconnectionDelayMax: 3000,
      timeout: 5000,
    }),
  ensureFresh: http.ensureFresh,
  now: () => Date.now(),
  isOnline: () => navigator.onLine !== false,
})

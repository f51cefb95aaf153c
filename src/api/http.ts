import { z } from 'zod'
import { API, ROUTES } from '../shared/contract/routes.ts'
import type { RouteAnswer, RouteContract, RouteKey } from '../shared/contract/routes.ts'
import { Problem } from '../shared/contract/errors.ts'
import type { SignedIn } from '../shared/contract/auth.ts'
import { ApiProblem } from './apiProblem.ts'

// The page's content security policy allows no code made from text, which zod would otherwise use for speed.
z.config({ jitless: true })

type Input<K extends RouteKey, P extends string> =
  (typeof ROUTES)[K] extends Record<P, infer S extends z.ZodType> ? z.input<S> : undefined
type Part<K extends RouteKey, P extends string> =
  Input<K, P> extends undefined
    ? { [Q in P]?: never }
    : object extends Input<K, P>
      ? { [Q in P]?: Input<K, P> }
      : { [Q in P]: Input<K, P> }
export type Parts<K extends RouteKey> = Part<K, 'params'> & Part<K, 'query'> & Part<K, 'body'>
export interface CallOptions {
  signal?: AbortSignal
}
type Args<K extends RouteKey> =
  object extends Parts<K>
    ? [parts?: Parts<K>, options?: CallOptions]
    : [parts: Parts<K>, options?: CallOptions]

/** One call of the API: typed by the registry of routes, its answer parsed with the same contract. */
export type Api = <K extends RouteKey>(key: K, ...args: Args<K>) => Promise<RouteAnswer<K>>

interface Locks {
  request<T>(name: string, run: () => Promise<T>): Promise<T>
}

export interface HttpDeps {
  fetch: (url: string, init: RequestInit) => Promise<Response>
  now: () => number
  /** navigator.locks; only pages over https or from localhost have it */
  locks: Locks | undefined
  /** tells the other tabs of this browser */
  channel: Pick<BroadcastChannel, 'postMessage' | 'addEventListener'> | undefined
  /** what all tabs see at once, unlike a message on the channel */
  storage: Pick<Storage, 'getItem' | 'setItem'> | undefined
}

/** What happened to the sign-in, here or in another tab. */
export type SessionEvent =
  | { kind: 'signedIn'; signedIn: SignedIn }
  | { kind: 'ended'; problem: ApiProblem | null }
  | { kind: 'changedElsewhere' }

export interface Http {
  api: Api
  /** Makes sure that the short token is good; false when the sign-in has ended. */
  ensureFresh: () => Promise<boolean>
  onSession: (listener: (event: SessionEvent) => void) => () => void
}

const REFRESH_LOCK = 'evenstrung-refresh'
const REFRESHED_KEY = 'evenstrung.refreshed'
/** The token is renewed this long before it runs out, so that a slow request still arrives in time. */
const REFRESH_AHEAD_MS = 30_000
/** A token shorter than the time ahead must not be renewed at every request. */
const SHORTEST_REFRESH_GAP_MS = 20_000

type TabMessage = { kind: 'refreshed' } | { kind: 'changed' }
const Refreshed = z.object({ at: z.number(), until: z.number() })
type Refreshed = z.infer<typeof Refreshed>

/** Builds the client of the API. The outside world is handed in, so that a test can fake it. */
export function createHttp(deps: HttpDeps): Http {
  const listeners = new Set<(event: SessionEvent) => void>()
  /** by this browser's clock; 0: not known, the server will say */
  let token: Refreshed = { at: 0, until: 0 }
  let refreshing: Promise<boolean> | null = null

  function tell(event: SessionEvent): void {
    for (const listener of listeners) listener(event)
  }

  deps.channel?.addEventListener('message', (event) => {
    const message = event.data as TabMessage
    if (message.kind === 'refreshed') token = lastRefreshed() ?? token
    else {
      token = { at: 0, until: 0 }
      tell({ kind: 'changedElsewhere' })
    }
  })

  function lastRefreshed(): Refreshed | null {
    const text = deps.storage?.getItem(REFRESHED_KEY)
    if (!text) return null
    try {
      return Refreshed.parse(JSON.parse(text))
    } catch {
      // Written by another version of this page: the server's answer decides instead.
      return null
    }
  }

  function remember(signedIn: SignedIn, serverNow: number): void {
    const at = deps.now()
    // Lifetime is counted from the server's own clock: the terminal's may be hours off.
    token = { at, until: at + (Date.parse(signedIn.tokenUntil) - serverNow) }
    deps.storage?.setItem(REFRESHED_KEY, JSON.stringify(token))
  }

  async function send(url: string, init: RequestInit): Promise<Response> {
    try {
      return await deps.fetch(url, init)
    } catch (cause) {
      if (init.signal?.aborted) throw cause
      throw new ApiProblem('client.offline', { cause })
    }
  }

  async function call<K extends RouteKey>(
    key: K,
    parts: AnyParts,
    signal?: AbortSignal,
  ): Promise<RouteAnswer<K>> {
    const route: RouteContract = ROUTES[key]
    const response = await send(urlOf(route, parts), {
      method: route.method.toUpperCase(),
      credentials: 'same-origin',
      headers: {
        accept: 'application/json',
        ...(parts.body === undefined ? {} : { 'content-type': 'application/json' }),
      },
      body: parts.body === undefined ? undefined : JSON.stringify(parts.body),
      signal,
    })
    const value = await bodyOf(response, signal)
    if (!response.ok) throw problemOf(response, value)
    const parsed = route.answer.safeParse(value)
    if (!parsed.success) throw new ApiProblem('client.answer', { cause: parsed.error })
    const answer = parsed.data as RouteAnswer<K>
    if (route.answer === ROUTES['auth.me'].answer) {
      remember(answer as SignedIn, serverTimeOf(response) ?? deps.now())
    }
    return answer
  }

  /** One refresh at a time: in this tab by the shared promise, across tabs by the lock. */
  function refresh(decidedAt: number): Promise<boolean> {
    refreshing ??= underLock(() => refreshUnlessDone(decidedAt)).finally(() => {
      refreshing = null
    })
    return refreshing
  }

  function underLock(run: () => Promise<boolean>): Promise<boolean> {
    return deps.locks ? deps.locks.request(REFRESH_LOCK, run) : run()
  }

  async function refreshUnlessDone(decidedAt: number): Promise<boolean> {
    const elsewhere = lastRefreshed()
    if (elsewhere && elsewhere.at > decidedAt && elsewhere.until - REFRESH_AHEAD_MS > deps.now()) {
      token = elsewhere
      return true
    }
    try {
      await call('auth.refresh', {})
    } catch (cause) {
      if (!(cause instanceof ApiProblem) || cause.status !== 401) throw cause
      token = { at: 0, until: 0 }
      tell({ kind: 'ended', problem: cause })
      return false
    }
    deps.channel?.postMessage({ kind: 'refreshed' } satisfies TabMessage)
    return true
  }

  async function ensureFresh(): Promise<boolean> {
    const now = deps.now()
    const due = token.until - REFRESH_AHEAD_MS
    if (token.until === 0 || now < due || now - token.at < SHORTEST_REFRESH_GAP_MS) return true
    return refresh(now)
  }

  async function api<K extends RouteKey>(key: K, ...args: Args<K>): Promise<RouteAnswer<K>> {
    const parts = (args[0] ?? {}) as AnyParts
    const signal = args[1]?.signal
    const isPublic = ROUTES[key].access === 'public'
    const answer = await (isPublic ? call(key, parts, signal) : callSignedIn(key, parts, signal))
    if (key === 'auth.signIn' || key === 'invites.accept') {
      changed({ kind: 'signedIn', signedIn: answer as SignedIn })
    }
    if (key === 'auth.signOut') changed({ kind: 'ended', problem: null })
    return answer
  }

  async function callSignedIn<K extends RouteKey>(
    key: K,
    parts: AnyParts,
    signal: AbortSignal | undefined,
  ): Promise<RouteAnswer<K>> {
    await ensureFresh()
    const sentAt = deps.now()
    try {
      return await call(key, parts, signal)
    } catch (cause) {
      if (!(cause instanceof ApiProblem) || cause.status !== 401) throw cause
      if (!(await refresh(sentAt))) throw cause
      return call(key, parts, signal)
    }
  }

  function changed(event: SessionEvent): void {
    if (event.kind === 'ended') token = { at: 0, until: 0 }
    tell(event)
    deps.channel?.postMessage({ kind: 'changed' } satisfies TabMessage)
  }

  return {
    api,
    ensureFresh,
    onSession(listener) {
      listeners.add(listener)
      return () => listeners.delete(listener)
    },
  }
}

type Plain = string | number | boolean | null | undefined
interface AnyParts {
  params?: Record<string, Plain>
  query?: Record<string, Plain>
  body?: unknown
}

function urlOf(route: RouteContract, parts: AnyParts): string {
  const path = route.path.replace(/:([a-zA-Z]+)/g, (_, name: string) =>
    encodeURIComponent(String(parts.params?.[name] ?? '')),
  )
  const query = new URLSearchParams()
  for (const [name, value] of Object.entries(parts.query ?? {})) {
    if (value !== undefined && value !== null && value !== '') query.set(name, String(value))
  }
  const text = query.toString()
  return `${API}${path}${text ? `?${text}` : ''}`
}

async function bodyOf(response: Response, signal: AbortSignal | undefined): Promise<unknown> {
  let text: string
  try {
    text = await response.text()
  } catch (cause) {
    if (signal?.aborted) throw cause
    throw new ApiProblem('client.offline', { cause })
  }
  try {
    return text === '' ? undefined : JSON.parse(text)
  } catch (cause) {
    // A proxy's error page instead of an answer of the server.
    throw new ApiProblem(response.status >= 500 ? 'client.offline' : 'client.answer', { cause })
  }
}

function problemOf(response: Response, value: unknown): ApiProblem {
  const problem = Problem.safeParse(value)
  if (problem.success) return new ApiProblem(problem.data)
  return new ApiProblem(response.status >= 500 ? 'client.offline' : 'client.answer', { cause: problem.error })
}

function serverTimeOf(response: Response): number | null {
  const at = Date.parse(response.headers.get('date') ?? '')
  return Number.isFinite(at) ? at : null
}

function storageOf(): Storage | undefined {
  try {
    return globalThis.localStorage
  } catch {
    // A browser set to keep nothing throws here; each tab then minds its own token.
    return undefined
  }
}

export const http = createHttp({
  fetch: (url, init) => globalThis.fetch(url, init),
  now: () => Date.now(),
  locks: globalThis.navigator?.locks,
  channel: typeof BroadcastChannel === 'undefined' ? undefined : new BroadcastChannel('evenstrung'),
  storage: storageOf(),
})

export const api: Api = http.api

import { beforeEach, expect, test, vi } from 'vitest'
import { createHttp } from '../../../src/api/http.ts'
import type { Http, HttpDeps, SessionEvent } from '../../../src/api/http.ts'
import { ApiProblem } from '../../../src/api/apiProblem.ts'
import { ERRORS } from '../../../src/shared/contract/errors.ts'
import type { ErrorCode } from '../../../src/shared/contract/errors.ts'

const START = Date.parse('2026-12-01T07:00:00.000Z')
const TOKEN_MS = 600_000
const HEALTH = { ok: true, database: true, method: 1, version: '0.1.0' }
const PERSON = {
  id: '3c4d5e6f-7081-4293-a4b5-c6d7e8f90112',
  name: 'Bench hand',
  email: 'installer@harrowlane.test',
  roles: ['installer'],
  permissions: ['runChecks', 'read'],
}

/** A server in memory: a token that runs out, a refresh cookie that works until it is taken away. */
function fakeServer() {
  const server = {
    nowMs: START,
    tokenUntil: 0,
    refreshWorks: true,
    calls: [] as string[],
    /** answers that wait until they are let go */
    holdRefresh: null as Promise<void> | null,
    override: null as ((url: string, init: RequestInit) => Promise<Response>) | null,
  }
  const json = (status: number, body: unknown) =>
    new Response(JSON.stringify(body), {
      status,
      headers: { 'content-type': 'application/json', date: new Date(server.nowMs).toUTCString() },
    })
  const refuse = (status: number, code: ErrorCode) =>
    json(status, { type: `/problems/${code}`, code, status, ...ERRORS[code], requestId: 'r1' })
  const signedIn = () => {
    server.tokenUntil = server.nowMs + TOKEN_MS
    return json(200, {
      person: PERSON,
      tokenUntil: new Date(server.tokenUntil).toISOString(),
      sessionId: '708192a3-b4c5-46d7-a8f9-011223344556',
    })
  }
  const fetch = async (url: string, init: RequestInit): Promise<Response> => {
    server.calls.push(`${init.method} ${url}`)
    if (server.override) return server.override(url, init)
    if (url.endsWith('/auth/sign-in')) return signedIn()
    if (url.endsWith('/auth/refresh')) {
      await server.holdRefresh
      return server.refreshWorks ? signedIn() : refuse(401, 'sign-in.required')
    }
    if (url.endsWith('/health')) return json(200, HEALTH)
    if (server.nowMs >= server.tokenUntil) return refuse(401, 'sign-in.required')
    if (url.includes('/scan/')) return json(200, { kind: 'unknownSerial', serial: url.split('/').at(-1) })
    if (url.endsWith('/auth/sign-out')) return json(200, {})
    return refuse(404, 'route.unknown')
  }
  return { server, fetch, json, refuse }
}

/** What the tabs of one browser share. */
function fakeBrowser(
  fake: ReturnType<typeof fakeServer>,
  options: { locks?: boolean; clockAheadMs?: number } = {},
) {
  const kept = new Map<string, string>()
  const tabs: { listener: ((event: MessageEvent) => void) | null }[] = []
  let queue: Promise<unknown> = Promise.resolve()
  const locks: HttpDeps['locks'] =
    options.locks === false
      ? undefined
      : {
          request: <T>(_name: string, run: () => Promise<T>) => {
            const mine = queue.then(run)
            queue = mine.catch(() => undefined)
            return mine
          },
        }
  return (): Http => {
    const tab: (typeof tabs)[number] = { listener: null }
    tabs.push(tab)
    return createHttp({
      fetch: fake.fetch,
      now: () => fake.server.nowMs + (options.clockAheadMs ?? 0),
      locks,
      channel: {
        postMessage: (data: unknown) => {
          for (const other of tabs) if (other !== tab) other.listener?.({ data } as MessageEvent)
        },
        addEventListener: (_name: string, listener: unknown) => {
          tab.listener = listener as (event: MessageEvent) => void
        },
      },
      storage: {
        getItem: (key) => kept.get(key) ?? null,
        setItem: (key, value) => void kept.set(key, value),
      },
    })
  }
}

let fake: ReturnType<typeof fakeServer>
beforeEach(() => {
  fake = fakeServer()
})
const refreshes = () => fake.server.calls.filter((call) => call.endsWith('/auth/refresh')).length
const scan = (http: Http, code = 'HL2401873') => http.api('scan.resolve', { params: { code } })
const signIn = (http: Http) =>
  http.api('auth.signIn', { body: { email: PERSON.email, password: 'a long sentence' } })
const problemOf = (promise: Promise<unknown>) =>
  promise.then(
    () => null,
    (cause: unknown) => cause as ApiProblem,
  )

test('api() puts parameters and query into the address and parses the answer', async () => {
  const http = fakeBrowser(fake)()
  await signIn(http)
  expect(await scan(http, 'A B/1')).toEqual({ kind: 'unknownSerial', serial: 'A%20B%2F1' })
  fake.server.override = () => Promise.resolve(fake.json(200, { items: [], next: null }))
  await http.api('instruments.list', { query: { search: 'HL 24', after: undefined } })
  expect(fake.server.calls.at(-1)).toBe('GET /api/v1/instruments?search=HL+24')
})

test('api() throws the problem that the server gave', async () => {
  const http = fakeBrowser(fake)()
  fake.server.override = () => Promise.resolve(fake.refuse(409, 'bench.busy'))
  const problem = await problemOf(http.api('health.read'))
  expect(problem).toBeInstanceOf(ApiProblem)
  expect(problem).toMatchObject({
    code: 'bench.busy',
    status: 409,
    requestId: 'r1',
    title: ERRORS['bench.busy'].title,
  })
})

test('api() tells an unreachable server from an answer that it does not understand', async () => {
  const http = fakeBrowser(fake)()
  fake.server.override = () => Promise.reject(new TypeError('failed to fetch'))
  expect((await problemOf(http.api('health.read')))?.code).toBe('client.offline')
  fake.server.override = () => Promise.resolve(new Response('<html>bad gateway</html>', { status: 502 }))
  expect((await problemOf(http.api('health.read')))?.code).toBe('client.offline')
  fake.server.override = () => Promise.resolve(fake.json(200, { ok: 'yes' }))
  expect((await problemOf(http.api('health.read')))?.code).toBe('client.answer')
})

test('api() lets a cancelled request fail as cancelled', async () => {
  const http = fakeBrowser(fake)()
  fake.server.override = (_url, init) =>
    new Promise((_resolve, reject) => {
      init.signal!.addEventListener('abort', () => reject(new DOMException('stopped', 'AbortError')))
    })
  const stop = new AbortController()
  const answer = problemOf(http.api('health.read', {}, { signal: stop.signal }))
  stop.abort()
  expect((await answer)?.name).toBe('AbortError')
})

test('api() does not refresh while the token is good', async () => {
  const http = fakeBrowser(fake)()
  await signIn(http)
  await scan(http)
  expect(refreshes()).toBe(0)
})

test('api() refreshes ahead of the end of the token', async () => {
  const http = fakeBrowser(fake)()
  await signIn(http)
  fake.server.nowMs += TOKEN_MS - 10_000
  await scan(http)
  expect(refreshes()).toBe(1)
  expect(fake.server.calls.filter((call) => call.includes('/scan/'))).toHaveLength(1)
})

test("api() counts the token's life by the server's clock, not by the terminal's", async () => {
  const http = fakeBrowser(fake, { clockAheadMs: 5 * 3_600_000 })()
  await signIn(http)
  await scan(http)
  expect(refreshes()).toBe(0)
})

test('api() refreshes on 401 and asks once more', async () => {
  const http = fakeBrowser(fake)()
  expect(await scan(http)).toMatchObject({ kind: 'unknownSerial' })
  expect(fake.server.calls).toEqual([
    'GET /api/v1/scan/HL2401873',
    'POST /api/v1/auth/refresh',
    'GET /api/v1/scan/HL2401873',
  ])
})

test('api() asks again only once', async () => {
  const http = fakeBrowser(fake)()
  const { fetch } = fake
  fake.server.override = async (url, init) => {
    if (!url.endsWith('/auth/refresh')) return fake.refuse(401, 'sign-in.required')
    fake.server.override = null
    const answer = await fetch(url, init)
    fake.server.tokenUntil = 0
    return answer
  }
  expect((await problemOf(scan(http)))?.status).toBe(401)
  expect(fake.server.calls.filter((call) => call.includes('/scan/'))).toHaveLength(2)
})

test('api() refreshes once for many requests of one tab', async () => {
  const http = fakeBrowser(fake)()
  await Promise.all([scan(http), scan(http), scan(http), scan(http)])
  expect(refreshes()).toBe(1)
})

test('api() refreshes once for two tabs, under the lock', async () => {
  const openTab = fakeBrowser(fake)
  const [one, two] = [openTab(), openTab()]
  let letGo: () => void = () => undefined
  fake.server.holdRefresh = new Promise((resolve) => {
    letGo = resolve
  })
  const both = Promise.all([scan(one), scan(two)])
  await vi.waitFor(() => expect(refreshes()).toBe(1))
  fake.server.nowMs += 200
  letGo()
  await both
  expect(refreshes()).toBe(1)
})

test('api() works without locks, as over plain http', async () => {
  const http = fakeBrowser(fake, { locks: false })()
  await Promise.all([scan(http), scan(http)])
  expect(refreshes()).toBe(1)
})

test('api() says once that the sign-in has ended when the refresh is refused', async () => {
  const http = fakeBrowser(fake)()
  const events: SessionEvent[] = []
  http.onSession((event) => events.push(event))
  fake.server.refreshWorks = false
  const problem = await problemOf(scan(http))
  expect(problem?.code).toBe('sign-in.required')
  expect(events).toEqual([{ kind: 'ended', problem: expect.objectContaining({ status: 401 }) as ApiProblem }])
})

test('api() does not end the sign-in when the refresh only fails to arrive', async () => {
  const http = fakeBrowser(fake)()
  const events: SessionEvent[] = []
  http.onSession((event) => events.push(event))
  const { fetch } = fake
  fake.server.override = (url, init) => {
    if (url.endsWith('/auth/refresh')) return Promise.reject(new TypeError('failed to fetch'))
    fake.server.override = null
    const answer = fetch(url, init)
    fake.server.override = () => Promise.reject(new TypeError('failed to fetch'))
    return answer
  }
  expect((await problemOf(scan(http)))?.code).toBe('client.offline')
  expect(events).toEqual([])
})

test('api() does not refresh for a wrong password', async () => {
  const http = fakeBrowser(fake)()
  fake.server.override = () => Promise.resolve(fake.refuse(401, 'sign-in.wrong'))
  expect((await problemOf(signIn(http)))?.code).toBe('sign-in.wrong')
  expect(refreshes()).toBe(0)
})

test('api() tells the other tabs of a sign-in and a sign-out', async () => {
  const openTab = fakeBrowser(fake)
  const [one, two] = [openTab(), openTab()]
  const here: string[] = []
  const there: string[] = []
  one.onSession((event) => here.push(event.kind))
  two.onSession((event) => there.push(event.kind))
  await signIn(one)
  await one.api('auth.signOut', { body: { everywhere: false } })
  expect(here).toEqual(['signedIn', 'ended'])
  expect(there).toEqual(['changedElsewhere', 'changedElsewhere'])
})

import { mkdtempSync, rmSync } from 'node:fs'
import type { AddressInfo } from 'node:net'
import { tmpdir } from 'node:os'
import path from 'node:path'
import type { Knex } from 'knex'
import pino from 'pino'
import { io } from 'socket.io-client'
import type { Socket } from 'socket.io-client'
import { readConfig } from '../../server/config.ts'
import { connect } from '../../server/connect.ts'
import { createServer } from '../../server/createServer.ts'
import type { RunningServer } from '../../server/createServer.ts'
import { DEMO_PASSWORD, seedDemo } from '../../server/cli/seed.ts'
import type { BenchToServer, ServerToBench } from '../../src/shared/contract/frames.ts'
import { BENCH_NAMESPACE } from '../../src/shared/contract/frames.ts'
import type { ScreenToServer, ServerToScreen } from '../../src/shared/contract/live.ts'
import { LIVE_NAMESPACE } from '../../src/shared/contract/live.ts'
import { Problem } from '../../src/shared/contract/errors.ts'
import { API, ROUTES } from '../../src/shared/contract/routes.ts'
import type { RouteAnswer, RouteKey } from '../../src/shared/contract/routes.ts'
import { createTestDatabase } from './database.ts'

export type BenchClient = Socket<ServerToBench, BenchToServer>
export type ScreenClient = Socket<ServerToScreen, ScreenToServer>

export class Refused extends Error {
  readonly problem: Problem
  constructor(problem: Problem) {
    super(`${problem.code} ${problem.detail ?? ''} ${JSON.stringify(problem.fields ?? problem.facts ?? {})}`)
    this.problem = problem
  }
}

/** Someone who is signed in and calls the API as the page does. */
export interface TestPerson {
  cookie: string
  call: <K extends RouteKey>(
    key: K,
    input?: { params?: Record<string, string>; query?: Record<string, string>; body?: unknown },
  ) => Promise<RouteAnswer<K>>
}

export interface TestServer {
  server: RunningServer
  url: string
  knex: Knex
  databaseUrl: string
  ownerUrl: string
  benchTokens: Record<string, string>
  /** by the name before the @ of the demo account */
  signIn: (account: string) => Promise<TestPerson>
  bench: (token: string) => BenchClient
  screen: (person: TestPerson) => ScreenClient
  /** Ends the server and starts a new one on the same database and port. */
  restart: () => Promise<void>
  close: () => Promise<void>
}

/** The demo workshop on a real database, with real HTTP and real sockets on a port of its own. */
export async function startTestServer(
  options: { now?: () => Date; elapsedMs?: () => number; env?: Record<string, string> } = {},
): Promise<TestServer> {
  const database = await createTestDatabase()
  const dataDir = mkdtempSync(path.join(tmpdir(), 'evenstrung-test-'))
  const config = readConfig({
    DATABASE_URL: database.url,
    DATA_DIR: dataDir,
    JWT_SECRET: 'tests only tests only tests only tests only',
    BCRYPT_COST: '4',
    LOG_LEVEL: 'silent',
    ...options.env,
  })
  const log = pino({ level: config.logLevel })
  const knex = connect(database.url, 4)
  const seeded = await seedDemo(knex, {
    password: DEMO_PASSWORD,
    bcryptCost: 4,
    at: options.now?.() ?? new Date(),
  })
  if (!seeded) throw new Error('a new test database is empty')
  const sockets = new Set<BenchClient | ScreenClient>()

  let pool = connect(database.url, 8)
  let server = await createServer({ config, knex: pool, log, now: options.now, elapsedMs: options.elapsedMs })
  const listen = (port: number) =>
    new Promise<void>((resolve) => server.http.listen(port, '127.0.0.1', () => resolve()))
  await listen(0)
  const { port } = server.http.address() as AddressInfo
  const url = `http://127.0.0.1:${port}`

  const person = (cookie: string): TestPerson => ({
    cookie,
    call: async (key, input = {}) => {
      const contract = ROUTES[key]
      const place = contract.path.replace(/:(\w+)/g, (_, name: string) =>
        encodeURIComponent(input.params![name]!),
      )
      const query = input.query ? `?${new URLSearchParams(input.query).toString()}` : ''
      const answer = await fetch(`${url}${API}${place}${query}`, {
        method: contract.method.toUpperCase(),
        headers: { cookie, origin: url, ...(input.body ? { 'content-type': 'application/json' } : {}) },
        body: input.body ? JSON.stringify(input.body) : undefined,
      })
      const body: unknown = await answer.json()
      if (!answer.ok) throw new Refused(Problem.parse(body))
      return contract.answer.parse(body) as never
    },
  })

  return {
    get server() {
      return server
    },
    url,
    knex,
    databaseUrl: database.url,
    ownerUrl: database.ownerUrl,
    benchTokens: seeded.benchTokens,
    signIn: async (account) => {
      const answer = await fetch(`${url}${API}/auth/sign-in`, {
        method: 'POST',
        headers: { 'content-type': 'application/json', origin: url },
        body: JSON.stringify({ email: `${account}@harrowlane.test`, password: DEMO_PASSWORD }),
      })
      if (!answer.ok) throw new Refused(Problem.parse(await answer.json()))
      const cookie = answer.headers
        .getSetCookie()
        .map((line) => line.split(';')[0])
        .join('; ')
      return person(cookie)
    },
    bench: (token) => {
      const socket: BenchClient = io(url + BENCH_NAMESPACE, {
        transports: ['websocket'],
        auth: { token },
        forceNew: true,
        reconnection: false,
      })
      sockets.add(socket)
      return socket
    },
    screen: (of) => {
      const socket: ScreenClient = io(url + LIVE_NAMESPACE, {
        transports: ['websocket'],
        extraHeaders: { cookie: of.cookie, origin: url },
        forceNew: true,
        reconnection: false,
      })
      sockets.add(socket)
      return socket
    },
    restart: async () => {
      await server.close()
      await pool.destroy()
      pool = connect(database.url, 8)
      server = await createServer({ config, knex: pool, log, now: options.now, elapsedMs: options.elapsedMs })
      await listen(port)
    },
    close: async () => {
      for (const socket of sockets) socket.disconnect()
      await server.close()
      await pool.destroy()
      await knex.destroy()
      await database.drop()
      rmSync(dataDir, { recursive: true, force: true })
    },
  }
}

/** The first message of that name. */
export function once<S extends BenchClient | ScreenClient>(socket: S, event: string): Promise<unknown> {
  return new Promise((resolve) => (socket as Socket).once(event, resolve))
}

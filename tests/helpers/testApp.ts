import { randomUUID } from 'node:crypto'
import type { Express } from 'express'
import type { Knex } from 'knex'
import pino from 'pino'
import type { Logger } from 'pino'
import request from 'supertest'
import type { BenchHello } from '../../src/shared/contract/frames.ts'
import type { Role } from '../../src/shared/contract/permissions.ts'
import { API, ROUTES } from '../../src/shared/contract/routes.ts'
import type { RouteKey } from '../../src/shared/contract/routes.ts'
import type { SimulationCommand } from '../../src/shared/contract/simulation.ts'
import { createApp } from '../../server/app.ts'
import { createPasswords } from '../../server/auth/passwords.ts'
import type { Passwords } from '../../server/auth/passwords.ts'
import { createSessions } from '../../server/auth/sessions.ts'
import type { Sessions } from '../../server/auth/sessions.ts'
import { readConfig } from '../../server/config.ts'
import type { Config } from '../../server/config.ts'
import { connect } from '../../server/connect.ts'
import { createHandlers } from '../../server/handlers.ts'
import type { Handlers, HandlersOf } from '../../server/http/registry.ts'
import { createTestDatabase } from './database.ts'
import type { TestDatabase } from './database.ts'

export interface TestClock {
  now: () => Date
  advance: (ms: number) => void
}

/** A clock that stands still until it is moved. */
export function createTestClock(start = '2026-03-04T09:00:00.000Z'): TestClock {
  let ms = Date.parse(start)
  return {
    now: () => new Date(ms),
    advance: (by) => {
      ms += by
    },
  }
}

export function testConfig(env: Record<string, string> = {}): Config {
  return readConfig({
    DATABASE_URL: 'mysql://nobody@127.0.0.1/nothing',
    DATA_DIR: '/nonexistent/evenstrung',
    JWT_SECRET: 'k3yOfTheTests-0123456789-abcdefghijkl',
    BCRYPT_COST: '4',
    LOG_LEVEL: 'silent',
    ...env,
  })
}

/** Benches as the tests say; commands are kept. */
export function createTestHub() {
  const connected = new Set<string>()
  const hellos = new Map<string, BenchHello>()
  const commands: { benchId: string; command: SimulationCommand }[] = []
  return {
    connected,
    commands,
    hellos,
    helloOf: (benchId: string) => hellos.get(benchId) ?? null,
    isConnected: (benchId: string) => connected.has(benchId),
    simulate: (benchId: string, command: SimulationCommand) => {
      commands.push({ benchId, command })
      return Promise.resolve()
    },
  }
}

const notHere = () => Promise.reject(new Error('runs are not part of this test'))
export const noRuns = Object.fromEntries(
  Object.keys(ROUTES)
    .filter((key) => key.startsWith('runs.'))
    .map((key) => [key, notHere]),
) as unknown as HandlersOf<'runs'>

export interface TestApp {
  app: Express
  knex: Knex
  config: Config
  clock: TestClock
  sessions: Sessions
  passwords: Passwords
  hub: ReturnType<typeof createTestHub>
  database: TestDatabase
  close: () => Promise<void>
}

export interface TestAppOptions {
  env?: Record<string, string>
  log?: Logger
  /** Watches or replaces the hashing of passwords. */
  wrapPasswords?: (passwords: Passwords) => Passwords
  /** Replaces single routes. */
  handlers?: Partial<Handlers>
}

/** The app on a schema of its own, with a clock that stands still; call `close` in `afterAll`. */
export async function createTestApp(options: TestAppOptions = {}): Promise<TestApp> {
  const database = await createTestDatabase()
  const config = testConfig({ DATABASE_URL: database.url, ...options.env })
  const knex = connect(database.url, 6)
  const clock = createTestClock()
  const { now } = clock
  const log = options.log ?? pino({ level: 'silent' })
  const ownPasswords = createPasswords(config)
  const passwords = options.wrapPasswords?.(ownPasswords) ?? ownPasswords
  const sessions = createSessions(knex, config, now)
  const hub = createTestHub()
  const about = { method: 1, version: '0.0.0-test' }
  const protocolSchema = { title: 'protocol' }
  const handlers = {
    ...createHandlers({ config, knex, sessions, passwords, hub, runs: noRuns, protocolSchema, about, now }),
    ...options.handlers,
  }
  return {
    app: createApp({ config, handlers, sessions, log }),
    knex,
    config,
    clock,
    sessions,
    passwords,
    hub,
    database,
    close: async () => {
      await ownPasswords.close()
      await knex.destroy()
      await database.drop()
    },
  }
}

export const PASSWORD = 'correct horse battery'

export interface TestPerson {
  id: string
  name: string
  email: string
}

/** A person with that role who can sign in with PASSWORD. */
export async function addPerson(
  { knex, passwords, clock }: Pick<TestApp, 'knex' | 'passwords' | 'clock'>,
  roles: readonly Role[],
  overrides: { name?: string; email?: string; isDemo?: boolean } = {},
): Promise<TestPerson> {
  const id = randomUUID()
  const { name = `Person ${id.slice(0, 8)}`, email = `p${id.slice(0, 8)}@harrowlane.test` } = overrides
  await knex('users').insert({
    id,
    name,
    email,
    password_hash: await passwords.hash(PASSWORD),
    is_demo: overrides.isDemo ?? false,
    created_at: clock.now(),
  })
  await knex('user_roles').insert(roles.map((role) => ({ user_id: id, role })))
  return { id, name, email }
}

/** A browser in which this person has signed in. */
export async function signedInAgent(app: Express, email: string) {
  const agent = request.agent(app)
  await agent.post(`${API}/auth/sign-in`).send({ email, password: PASSWORD }).expect(200)
  return agent
}

/** Value of a cookie that an answer sets; null when it sets none or clears it. */
export function setCookie(response: { headers: Record<string, unknown> }, name: string): string | null {
  const lines = (response.headers['set-cookie'] ?? []) as string[]
  const line = lines.find((candidate) => candidate.startsWith(`${name}=`))
  return line?.slice(name.length + 1).split(';')[0] || null
}

/** The route's address with a well-formed value in the place of each parameter. */
export function addressOf(key: RouteKey): string {
  const values: Record<string, string> = {
    id: '0b8f7d1e-6c58-4f0c-9a3e-111111111111',
    serial: 'HL2400001',
    code: 'HL2400001',
    token: 'x'.repeat(43),
  }
  return API + ROUTES[key].path.replace(/:(\w+)/g, (_all, name: string) => values[name]!)
}

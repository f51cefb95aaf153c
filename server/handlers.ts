import type { Knex } from 'knex'
import { createAuthHandlers } from './auth/auth.handlers.ts'
import { createAuthService } from './auth/auth.service.ts'
import type { Passwords } from './auth/passwords.ts'
import type { Sessions } from './auth/sessions.ts'
import { createSignInGuard } from './auth/signInGuard.ts'
import type { BenchConnections } from './benches/benchConnections.ts'
import { createBenchesHandlers } from './benches/benches.handlers.ts'
import { createCautionsHandlers } from './cautions/cautions.handlers.ts'
import type { Config } from './config.ts'
import { createHealthHandlers } from './health/health.handlers.ts'
import type { Handlers, HandlersOf } from './http/registry.ts'
import { createInstrumentsHandlers } from './instruments/instruments.handlers.ts'
import { createModelsHandlers } from './models/models.handlers.ts'
import { createOpenApi } from './openapi.ts'
import { createScanHandlers } from './scan/scan.handlers.ts'

export interface HandlerDeps {
  config: Config
  knex: Knex
  sessions: Sessions
  passwords: Passwords
  hub: BenchConnections
  runs: HandlersOf<'runs'>
  /** the bench protocol as JSON Schema */
  protocolSchema: Record<string, unknown>
  /** number of the method that judges new runs, and version of the program */
  about: { method: number; version: string }
  now: () => Date
}

/** All routes in one place; what is missing here does not compile. */
export function createHandlers(deps: HandlerDeps): Handlers {
  const { config, knex, sessions, passwords, hub, now, about } = deps
  const guard = createSignInGuard(knex, now)
  const auth = createAuthService({ knex, sessions, passwords, guard, now })
  const openApi = createOpenApi(about.version)
  return {
    ...createHealthHandlers(knex, about),
    'openapi.read': () => Promise.resolve(openApi),
    'protocol.read': () => Promise.resolve(deps.protocolSchema),
    ...createAuthHandlers({ knex, auth, sessions, config }),
    ...createCautionsHandlers(knex, config, now),
    ...createScanHandlers(knex),
    ...createModelsHandlers(knex, now),
    ...createBenchesHandlers(knex, hub, now),
    ...createInstrumentsHandlers(knex),
    ...deps.runs,
  }
}

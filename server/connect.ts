import knex from 'knex'
import type { Knex } from 'knex'

/** A pool that gives up soon: whoever waits is told so in seconds, and what is judged is kept meanwhile. */
export function connect(databaseUrl: string, connections = 10): Knex {
  const url = new URL(databaseUrl)
  return knex({
    client: 'mysql2',
    connection: {
      host: url.hostname,
      port: Number(url.port || 3306),
      user: decodeURIComponent(url.username),
      password: decodeURIComponent(url.password),
      database: url.pathname.slice(1),
      charset: 'utf8mb4',
      timezone: 'Z',
      connectTimeout: 3000,
      supportBigNumbers: true,
    },
    pool: { min: 0, max: connections, acquireTimeoutMillis: 4000, idleTimeoutMillis: 30_000 },
    acquireConnectionTimeout: 4000,
    // What goes wrong is thrown to whoever asked and logged there; knex would print it a second time.
    log: { warn: quiet, error: quiet, debug: quiet, deprecate: quiet },
  })
}

function quiet(): void {
  // see above
}

const AWAY = new Set([
  'ECONNREFUSED',
  'ECONNRESET',
  'EPIPE',
  'ETIMEDOUT',
  'PROTOCOL_CONNECTION_LOST',
  'ER_SERVER_SHUTDOWN',
  'ER_CON_COUNT_ERROR',
  'ER_DISK_FULL',
  'ER_RECORD_FILE_FULL',
])

/** True when the error means that the database did not answer, so that the outcome of a write is unknown. */
export function isStorageAway(error: unknown): boolean {
  if (!(error instanceof Error)) return false
  if (error.name === 'KnexTimeoutError' || error.name === 'TimeoutError') return true
  const code = (error as { code?: unknown }).code
  if (typeof code === 'string' && AWAY.has(code)) return true
  return /closed state|Connection lost|acquiring a connection/.test(error.message)
}

/** True when a unique key was already taken. */
export function isDuplicate(error: unknown): boolean {
  return error instanceof Error && (error as { code?: unknown }).code === 'ER_DUP_ENTRY'
}

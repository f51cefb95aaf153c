import path from 'node:path'
import { fileURLToPath } from 'node:url'
import { StartFault } from './fault.js'

/** @type {string} */
export const projectDir = path.resolve(fileURLToPath(new URL('..', import.meta.url)))

/**
 * @typedef {object} Settings
 * @property {number} port
 * @property {string} host
 * @property {string} dataDir absolute
 * @property {number} databasePort
 * @property {string} databaseName
 * @property {{ appUrl: string, ownerUrl: string } | undefined} externalDatabase
 * @property {'demo' | 'production'} mode
 */

/** @param {Record<string, string | undefined>} env @param {string} name @param {number} fallback */
function portFrom(env, name, fallback) {
  const text = env[name]
  if (text === undefined || text === '') return fallback
  const port = Number(text)
  if (!Number.isInteger(port) || port < 1 || port > 65535)
    throw new StartFault(`${name} is '${text}': set it to a whole number from 1 to 65535.`)
  return port
}

/**
 * Reads what the launcher itself needs; the server parses its own settings.
 * @param {Record<string, string | undefined>} [env]
 * @returns {Settings}
 */
export function readSettings(env = process.env) {
  const mode = env.EVENSTRUNG_MODE || 'demo'
  if (mode !== 'demo' && mode !== 'production')
    throw new StartFault(`EVENSTRUNG_MODE is '${mode}': set it to demo or production.`)
  const databaseName = env.DB_NAME || 'evenstrung'
  if (!/^evenstrung(_[a-z0-9_]{1,40})?$/.test(databaseName))
    throw new StartFault(
      `DB_NAME is '${databaseName}': use evenstrung, or evenstrung_ and small letters, digits or underscores.`,
    )
  return {
    port: portFrom(env, 'PORT', 4180),
    host: env.HOST || '127.0.0.1',
    dataDir: path.resolve(projectDir, env.DATA_DIR || '.data'),
    databasePort: portFrom(env, 'DB_PORT', 13306),
    databaseName,
    externalDatabase: externalDatabaseFrom(env),
    mode,
  }
}

/** @param {Record<string, string | undefined>} env */
function externalDatabaseFrom(env) {
  const appUrl = env.DATABASE_URL
  const ownerUrl = env.DATABASE_OWNER_URL
  if (!appUrl && !ownerUrl) return undefined
  if (!appUrl || !ownerUrl)
    throw new StartFault(
      'An own database server needs both DATABASE_URL (application user) and DATABASE_OWNER_URL (migrations): set the missing one, or neither for the private database.',
    )
  return { appUrl, ownerUrl }
}

import { randomBytes } from 'node:crypto'
import { chmodSync, mkdirSync, readFileSync, renameSync, writeFileSync } from 'node:fs'
import path from 'node:path'
import { StartFault, codeOf } from './fault.js'

/**
 * @typedef {object} Secrets
 * @property {string} databaseOwnerPassword
 * @property {string} databaseAppPassword
 * @property {string} jwtSecret hex of 48 random bytes
 * @property {Record<string, string>} [benchTokens] token by bench key
 */

/** @param {string} dataDir */
const fileOf = (dataDir) => path.join(dataDir, 'secrets.json')

/** @param {string} dataDir @returns {Partial<Secrets>} */
function readStored(dataDir) {
  const file = fileOf(dataDir)
  try {
    return JSON.parse(readFileSync(file, 'utf8'))
  } catch (error) {
    if (codeOf(error) === 'ENOENT') return {}
    throw new StartFault(
      `The secrets file ${file} cannot be read: make it readable for you, or restore it from a copy; if it is lost, delete it and everyone signs in anew.`,
      { cause: error },
    )
  }
}

/** @param {string} dataDir @param {Partial<Secrets>} secrets */
function write(dataDir, secrets) {
  mkdirSync(dataDir, { recursive: true, mode: 0o755 })
  const file = fileOf(dataDir)
  const draft = `${file}.${process.pid}`
  writeFileSync(draft, `${JSON.stringify(secrets, null, 2)}\n`, { mode: 0o600 })
  chmodSync(draft, 0o600)
  renameSync(draft, file)
}

/**
 * Reads the secrets of a data folder; those that are missing are made and stored, mode 600.
 * @param {string} dataDir
 * @returns {Secrets}
 */
export function readSecrets(dataDir) {
  const stored = readStored(dataDir)
  const random = () => randomBytes(48).toString('hex')
  const secrets = {
    ...stored,
    databaseOwnerPassword: stored.databaseOwnerPassword ?? random(),
    databaseAppPassword: stored.databaseAppPassword ?? random(),
    jwtSecret: stored.jwtSecret ?? random(),
  }
  if (JSON.stringify(secrets) !== JSON.stringify(stored)) write(dataDir, secrets)
  return secrets
}

/**
 * Adds or replaces some secrets and keeps the others.
 * @param {string} dataDir
 * @param {Partial<Secrets>} changes
 * @returns {Secrets}
 */
export function updateSecrets(dataDir, changes) {
  const secrets = { ...readSecrets(dataDir), ...changes }
  write(dataDir, secrets)
  return secrets
}

import { withLock } from '../lock.js'
import { requireFreePort } from '../ports.js'
import { printLine } from '../progress.js'
import { findDaemon, startDaemon, stopDaemon, HOST } from './daemon.js'
import { prepareDataFolder } from './prepare.js'
import { signOff, signOn } from './users.js'

/** @typedef {import('./instance.js').Instance} Instance */

/**
 * @typedef {object} PrivateDatabase
 * @property {number} pid
 * @property {number} port
 * @property {(name: string) => string} appUrl address for the application's user
 * @property {(name: string) => string} ownerUrl address for the user who owns the tables
 */

export const OWNER = 'evenstrung_owner'
export const APP = 'evenstrung_app'

/**
 * Makes users and rights as they should be, on every start: so that a lost or restored secrets file heals itself.
 * The application gets no right here; migrating grants them table by table.
 * @param {import('../secrets.js').Secrets} secrets
 * @param {string} databaseName
 * @returns {string[]}
 */
export function accountStatements(secrets, databaseName) {
  /** @param {string} user @param {string} password */
  const account = (user, password) => [
    `CREATE USER IF NOT EXISTS '${user}'@'${HOST}'`,
    `ALTER USER '${user}'@'${HOST}' IDENTIFIED BY '${password}'`,
  ]
  return [
    `CREATE DATABASE IF NOT EXISTS \`${databaseName}\``,
    ...account(OWNER, secrets.databaseOwnerPassword),
    ...account(APP, secrets.databaseAppPassword),
    `GRANT ALL ON \`evenstrung\`.* TO '${OWNER}'@'${HOST}' WITH GRANT OPTION`,
    `GRANT ALL ON \`evenstrung\\_%\`.* TO '${OWNER}'@'${HOST}' WITH GRANT OPTION`,
  ]
}

/**
 * Uses the private server: joins it when it runs, else makes and starts it.
 * @param {Instance} instance
 * @param {import('../secrets.js').Secrets} secrets
 * @param {{ databaseName?: string, extraStatements?: string[], portSetting?: string, print?: import('../progress.js').Print }} [options]
 * @returns {Promise<PrivateDatabase>}
 */
export async function joinDatabase(instance, secrets, options = {}) {
  const {
    databaseName = 'evenstrung',
    extraStatements = [],
    portSetting = 'DB_PORT',
    print = printLine,
  } = options
  return withLock(instance.root, async () => {
    const running = findDaemon(instance)
    if (!running) {
      // A killed server may still be letting go of it.
      await requireFreePort(instance.port, HOST, portSetting, { patienceMs: 1000 })
      await prepareDataFolder(instance, print)
    }
    const daemon =
      running ??
      (await startDaemon(
        instance,
        [...accountStatements(secrets, databaseName), ...extraStatements],
        portSetting,
      ))
    signOn(instance)
    /** @param {string} user @param {string} password */
    const urlFor = (user, password) => (/** @type {string} */ name) =>
      `mysql://${user}:${password}@${HOST}:${daemon.port}/${name}`
    return {
      ...daemon,
      appUrl: urlFor(APP, secrets.databaseAppPassword),
      ownerUrl: urlFor(OWNER, secrets.databaseOwnerPassword),
    }
  })
}

/**
 * Leaves the private server; the last one to leave stops it.
 * @param {Instance} instance
 * @returns {Promise<boolean>} whether it was stopped
 */
export async function leaveDatabase(instance) {
  return withLock(instance.root, async () => {
    if (!signOff(instance)) return false
    const daemon = findDaemon(instance)
    if (!daemon) return false
    await stopDaemon(daemon)
    return true
  })
}

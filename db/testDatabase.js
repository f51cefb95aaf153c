import path from 'node:path'
import { ensurePackages } from './packages.js'
import { findDaemon } from './mariadb/daemon.js'
import { instanceIn } from './mariadb/instance.js'
import { joinDatabase, leaveDatabase, APP } from './mariadb/privateDatabase.js'
import { livingUsers } from './mariadb/users.js'
import { nextFreePort } from './ports.js'
import { readSecrets } from './secrets.js'
import { projectDir } from './settings.js'

const FIRST_TEST_PORT = 13_316

// Rights outlive the database they are for; only the server's start can clear those of earlier test databases.
const forgetOldRights = [
  `DELETE FROM mysql.tables_priv WHERE Db LIKE 'evenstrung\\_t\\_%' AND User = '${APP}'`,
  `DELETE FROM mysql.columns_priv WHERE Db LIKE 'evenstrung\\_t\\_%' AND User = '${APP}'`,
  `DELETE FROM mysql.db WHERE Db LIKE 'evenstrung\\_t\\_%' AND User = '${APP}'`,
  'FLUSH PRIVILEGES',
]

/**
 * Uses the database server of the tests, apart from that of `npm start`; several test runs share one.
 * Not durable against a power cut, which no test can cause.
 * @param {Record<string, string | undefined>} [env]
 */
export async function joinTestDatabase(env = process.env) {
  const dataDir = path.resolve(projectDir, env.TEST_DATA_DIR || '.data-test')
  const root = path.join(dataDir, 'mariadb')
  const silent = () => {}
  await ensurePackages(['start'])
  const wished = Number(env.TEST_DB_PORT || FIRST_TEST_PORT)
  const instanceAt = (/** @type {number} */ port) => instanceIn({ root, port, durable: false })
  const port = findDaemon(instanceAt(wished)) ? wished : await nextFreePort(wished, '127.0.0.1')
  const instance = instanceAt(port)
  const server = await joinDatabase(instance, readSecrets(dataDir), {
    extraStatements: forgetOldRights,
    portSetting: 'TEST_DB_PORT',
    print: silent,
  })
  return {
    server,
    /** Whether no other test run uses the server now. */
    isAlone: () => livingUsers(instance).length === 1,
    leave: () => leaveDatabase(instance),
  }
}

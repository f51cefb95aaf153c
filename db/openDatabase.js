import path from 'node:path'
import { instanceIn } from './mariadb/instance.js'
import { joinDatabase, leaveDatabase } from './mariadb/privateDatabase.js'
import { ensurePackages } from './packages.js'
import { readSecrets } from './secrets.js'

/**
 * @typedef {object} OpenDatabase
 * @property {string} appUrl
 * @property {string} ownerUrl
 * @property {() => number | undefined} pid of the private server
 * @property {() => Promise<void>} revive starts the private server anew after it died
 * @property {() => Promise<void>} leave
 */

/**
 * The database that the settings name: an external one, or the private server, started when it does not run.
 * @param {import('./settings.js').Settings} settings
 * @returns {Promise<OpenDatabase>}
 */
export async function openDatabase(settings) {
  if (settings.externalDatabase)
    return {
      ...settings.externalDatabase,
      pid: () => undefined,
      revive: async () => {},
      leave: async () => {},
    }
  await ensurePackages(['start'])
  const instance = instanceIn({
    root: path.join(settings.dataDir, 'mariadb'),
    port: settings.databasePort,
  })
  const join = () =>
    joinDatabase(instance, readSecrets(settings.dataDir), { databaseName: settings.databaseName })
  let server = await join()
  return {
    appUrl: server.appUrl(settings.databaseName),
    ownerUrl: server.ownerUrl(settings.databaseName),
    pid: () => server.pid,
    revive: async () => {
      server = await join()
    },
    leave: async () => {
      await leaveDatabase(instance)
    },
  }
}

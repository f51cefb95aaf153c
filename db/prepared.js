import { readFileSync, rmSync, writeFileSync } from 'node:fs'
import path from 'node:path'
import { built } from './environment.js'
import { codeOf } from './fault.js'

/** @typedef {import('./settings.js').Settings} Settings */

/**
 * Notes that the private database was migrated, and seeded, by this very build, so that a second start need not ask
 * again. The note lies beside the data folder: whoever makes a new one, restores or migrates by hand removes it.
 * @param {string} dataDir
 */
const noteIn = (dataDir) => path.join(dataDir, 'mariadb', 'prepared')

/** @param {Settings} settings */
const noteOf = ({ databaseName, mode }) =>
  `${databaseName} ${mode} ${readFileSync(built('.server.stamp'), 'utf8')}`

/** @param {Settings} settings */
export function isPrepared(settings) {
  if (settings.externalDatabase) return false
  try {
    return readFileSync(noteIn(settings.dataDir), 'utf8') === noteOf(settings)
  } catch (error) {
    if (codeOf(error) === 'ENOENT') return false
    throw error
  }
}

/** @param {Settings} settings */
export function notePrepared(settings) {
  if (!settings.externalDatabase) writeFileSync(noteIn(settings.dataDir), noteOf(settings))
}

/** @param {Settings} settings */
export const forgetPrepared = (settings) => rmSync(noteIn(settings.dataDir), { force: true })

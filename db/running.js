import { readFileSync, renameSync, rmSync, writeFileSync } from 'node:fs'
import path from 'node:path'
import { StartFault, codeOf } from './fault.js'
import { tryLock } from './lock.js'
import { endProcess, startTimeOf } from './processes.js'

/**
 * What the launcher writes down about itself, for the next one.
 * @typedef {object} Running
 * @property {number} pid
 * @property {string} url
 * @property {{ name: string, pid: number, startTime: string }[]} services
 */

/** @param {string} dataDir */
const fileOf = (dataDir) => path.join(dataDir, 'running.json')

/** @param {string} dataDir @returns {Running | undefined} */
function read(dataDir) {
  try {
    return JSON.parse(readFileSync(fileOf(dataDir), 'utf8'))
  } catch (error) {
    if (codeOf(error) === 'ENOENT' || error instanceof SyntaxError) return undefined
    throw error
  }
}

/** @param {string} dataDir @param {Running} running */
export function noteRunning(dataDir, running) {
  const draft = `${fileOf(dataDir)}.${process.pid}`
  writeFileSync(draft, JSON.stringify(running))
  renameSync(draft, fileOf(dataDir))
}

/** @param {string} dataDir */
export const forgetRunning = (dataDir) => rmSync(fileOf(dataDir), { force: true })

/** @param {string} dataDir @returns {string} */
const lockSubject = (dataDir) => path.join(dataDir, 'running')

/**
 * Takes the data folder for this launcher until it ends.
 * @param {string} dataDir
 */
export async function claimDataFolder(dataDir) {
  const lock = await tryLock(lockSubject(dataDir))
  if (lock) return lock
  const other = read(dataDir)
  const who = other ? ` (process ${other.pid}, ${other.url})` : ''
  throw new StartFault(
    `Evenstrung is already starting or running from ${dataDir}${who}: use that one, end it with Ctrl-C there, or start a second one with its own DATA_DIR, PORT and DB_PORT.`,
  )
}

/** @param {string} dataDir @returns {Promise<boolean>} */
export async function isDataFolderClaimed(dataDir) {
  const lock = await tryLock(lockSubject(dataDir))
  await lock?.release()
  return lock === undefined
}

/**
 * Ends what a launcher left that was killed without a chance to clean up.
 * @param {string} dataDir
 * @param {import('./progress.js').Print} print
 */
export async function endLeftOvers(dataDir, print) {
  for (const { name, pid, startTime } of read(dataDir)?.services ?? []) {
    if (startTimeOf(pid) !== startTime) continue
    print(`Ending the ${name} that an earlier start left running`)
    await endProcess(pid, 15_000)
  }
  forgetRunning(dataDir)
}

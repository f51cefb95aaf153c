import { spawn } from 'node:child_process'
import { accessSync, constants, existsSync, mkdirSync, renameSync, rmSync, writeFileSync } from 'node:fs'
import { userInfo } from 'node:os'
import path from 'node:path'
import { requireDiskSpace } from '../disk.js'
import { StartFault, codeOf } from '../fault.js'
import { pathOfCommand } from '../packages.js'
import { endProcess, findProcesses } from '../processes.js'
import { step } from '../progress.js'

/** @typedef {import('./instance.js').Instance} Instance */

export const REDO_LOG_BYTES = 96 * 1024 * 1024
const FIRST_START_BYTES = 400_000_000
const LATER_START_BYTES = 50_000_000

export const isRoot = () => process.getuid?.() === 0

/**
 * Makes sure that the data folder is whole: makes it when there is none, clears what an interrupted first start
 * left, and refuses one that lacks parts instead of starting on it.
 * @param {Instance} instance
 * @param {import('../progress.js').Print} print
 */
export async function prepareDataFolder(instance, print) {
  makeFolders(instance)
  if (existsSync(instance.dataDir)) {
    requireWholeFolder(instance)
    requireDiskSpace(instance.root, LATER_START_BYTES, 'the database')
    return
  }
  for (const { pid } of findProcesses((args) => args.includes(`--datadir=${instance.unfinishedDir}`)))
    await endProcess(pid, 10_000)
  if (existsSync(instance.unfinishedDir)) {
    print('  an earlier first start was interrupted: its half-made database folder is made anew')
    rmSync(instance.unfinishedDir, { recursive: true, force: true })
  }
  requireDiskSpace(instance.root, FIRST_START_BYTES, 'a new database')
  await step('Making the private database', () => initialise(instance), { print })
}

/** @param {Instance} instance */
function makeFolders(instance) {
  try {
    for (const folder of [instance.root, instance.tmpDir, instance.usersDir])
      mkdirSync(folder, { recursive: true, mode: 0o700 })
    accessSync(instance.root, constants.W_OK)
  } catch (error) {
    if (codeOf(error) === 'EACCES' || codeOf(error) === 'EPERM')
      throw new StartFault(
        `The folder ${instance.root} belongs to another account: start as that account, or choose another folder with DATA_DIR.`,
        { cause: error },
      )
    throw error
  }
}

/** @param {Instance} instance */
function requireWholeFolder(instance) {
  const missing = ['ibdata1', 'mysql', 'aria_log_control'].filter(
    (name) => !existsSync(path.join(instance.dataDir, name)),
  )
  if (missing.length > 0)
    throw new StartFault(
      `The database folder ${instance.dataDir} is incomplete (${missing.join(', ')} missing) and was not touched: move it away and start again for a new database, then bring the records back with 'npm run restore'.`,
    )
}

/** @param {Instance} instance */
async function initialise(instance) {
  rmSync(path.join(instance.root, 'prepared'), { force: true })
  const args = [
    '--no-defaults',
    `--datadir=${instance.unfinishedDir}`,
    '--auth-root-authentication-method=socket',
    `--auth-root-socket-user=${accountName()}`,
    '--skip-test-db',
    '--skip-name-resolve',
    `--innodb-log-file-size=${REDO_LOG_BYTES}`,
    ...(isRoot() ? ['--user=root'] : []),
  ]
  const { exitCode, output } = await runQuietly(pathOfCommand('mariadb-install-db'), args)
  writeFileSync(path.join(instance.root, 'install.log'), output)
  if (exitCode === 0) {
    renameSync(instance.unfinishedDir, instance.dataDir)
    return
  }
  rmSync(instance.unfinishedDir, { recursive: true, force: true })
  if (saysDiskIsFull(output))
    throw new StartFault(
      `The disk became full while the database was made in ${instance.root}: free 400 MB and start again.`,
    )
  throw new StartFault(
    `The database could not be made in ${instance.root}: read ${path.join(instance.root, 'install.log')}, then start again.`,
  )
}

/** @param {string} text */
export const saysDiskIsFull = (text) =>
  /No space left on device|Errcode: 28|errno: 28|Disk (is )?full/i.test(text)

function accountName() {
  try {
    return userInfo().username
  } catch {
    // An account without an entry in the password file; nobody signs in this way, so root's name does no harm.
    return 'root'
  }
}

/**
 * @param {string} command
 * @param {string[]} args
 * @returns {Promise<{ exitCode: number | null, output: string }>}
 */
function runQuietly(command, args) {
  return new Promise((resolve, reject) => {
    const child = spawn(command, args, { stdio: ['ignore', 'pipe', 'pipe'] })
    let output = ''
    child.stdout.on('data', (chunk) => (output += chunk))
    child.stderr.on('data', (chunk) => (output += chunk))
    child.once('error', reject)
    child.once('close', (exitCode) => resolve({ exitCode, output }))
  })
}

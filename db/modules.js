import { readFileSync } from 'node:fs'
import path from 'node:path'
import { requireDiskSpace } from './disk.js'
import { codeOf } from './fault.js'
import { step } from './progress.js'
import { runChild } from './runChild.js'
import { projectDir } from './settings.js'

const NEEDED_BYTES = 500_000_000

/** @typedef {{ packages: Record<string, { version?: string, optional?: boolean }> }} Lock */

/** @param {string} file @returns {Lock | undefined} */
function readLock(file) {
  try {
    return JSON.parse(readFileSync(file, 'utf8'))
  } catch (error) {
    if (codeOf(error) === 'ENOENT') return undefined
    throw error
  }
}

/**
 * Whether node_modules holds what the lock file asks for. npm writes the list of what it installed last of all,
 * so an interrupted install counts as not current.
 * @param {string} [folder]
 */
export function modulesAreCurrent(folder = projectDir) {
  const wanted = readLock(path.join(folder, 'package-lock.json'))
  const installed = readLock(path.join(folder, 'node_modules', '.package-lock.json'))
  if (!wanted || !installed) return false
  return Object.entries(wanted.packages).every(([name, entry]) => {
    const found = installed.packages[name]
    if (name === '' || (!found && entry.optional)) return true
    return found?.version === entry.version
  })
}

/** @param {AbortSignal} [signal] */
export async function ensureModules(signal) {
  if (modulesAreCurrent()) return
  requireDiskSpace(projectDir, NEEDED_BYTES, "installing the program's packages")
  await step('Installing packages from package-lock.json (half a minute to two minutes)', () =>
    runChild('npm', ['ci', '--include=dev', '--no-audit', '--no-fund'], { signal, what: 'npm ci' }),
  )
}

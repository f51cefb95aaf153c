import { spawn } from 'node:child_process'
import { accessSync, constants, readFileSync } from 'node:fs'
import path from 'node:path'
import { StartFault } from './fault.js'
import { step } from './progress.js'

/** @typedef {{ package: string, commands: string[] }} DebianPackage */
/** @typedef {'start' | 'test'} Purpose */

/** @type {Record<Purpose, DebianPackage[]>} */
const packages = JSON.parse(readFileSync(new URL('./debian-packages.json', import.meta.url), 'utf8'))

/** @param {string} name @returns {string | undefined} */
function findCommand(name) {
  // Servers stand in sbin, which the PATH of an ordinary account leaves out.
  const folders = [...(process.env.PATH ?? '').split(':'), '/usr/local/sbin', '/usr/sbin', '/sbin']
  return folders
    .filter(Boolean)
    .map((folder) => path.join(folder, name))
    .find((file) => {
      try {
        accessSync(file, constants.X_OK)
        return true
      } catch {
        return false
      }
    })
}

/** @param {string} name */
export function pathOfCommand(name) {
  const file = findCommand(name)
  if (!file)
    throw new StartFault(`The program ${name} is missing: run 'npm start' once, it installs what it needs.`)
  return file
}

/**
 * @param {Purpose[]} purposes
 * @param {(name: string) => string | undefined} [find]
 * @returns {string[]} Debian packages whose programs are not there
 */
export function missingPackages(purposes, find = findCommand) {
  return purposes
    .flatMap((purpose) => packages[purpose])
    .filter(({ commands }) => commands.some((name) => !find(name)))
    .map((entry) => entry.package)
}

/**
 * The system as the installer sees it; a test puts another in its place.
 * @typedef {object} System
 * @property {(name: string) => string | undefined} find
 * @property {() => boolean} isRoot
 * @property {(words: string[]) => Promise<{ exitCode: number | null, output: string }>} run
 */

/** @type {System} */
const thisSystem = { find: findCommand, isRoot: () => process.getuid?.() === 0, run }

/**
 * Installs what is missing, as root or with a sudo that asks no password; else says the one command to run.
 * @param {Purpose[]} purposes
 * @param {System} [system]
 */
export async function ensurePackages(purposes, system = thisSystem) {
  const missing = missingPackages(purposes, system.find)
  if (missing.length === 0) return
  const install = ['apt-get', 'install', '-y', '--no-install-recommends', ...missing]
  const byHand = `sudo sh -c 'apt-get update && ${install.join(' ')}'`
  if (!system.find('apt-get'))
    throw new StartFault(
      `Missing: ${missing.join(', ')}, and this system has no apt-get: install them with its own package tool, then run the same command again.`,
    )
  const prefix = await rootPrefix(system)
  if (!prefix)
    throw new StartFault(
      `Missing: ${missing.join(', ')}. Run this once, then the same command again: ${byHand}`,
    )
  await step(`Installing from Debian: ${missing.join(', ')}`, async () => {
    const calm = ['env', 'DEBIAN_FRONTEND=noninteractive']
    const patience = ['-o', 'DPkg::Lock::Timeout=120']
    for (const command of [['apt-get', 'update'], install]) {
      const { exitCode, output } = await system.run([...prefix, ...calm, ...command, ...patience])
      if (exitCode !== 0)
        throw new StartFault(
          `${command.slice(0, 2).join(' ')} failed (${lastLine(output)}): check the network and the package sources, then run: ${byHand}`,
        )
    }
  })
  const still = missingPackages(purposes, system.find)
  if (still.length > 0)
    throw new StartFault(
      `Installed, but the programs of ${still.join(', ')} are still not found: reinstall these packages.`,
    )
}

/** @param {System} system @returns {Promise<string[] | undefined>} words before a command that runs it as root */
async function rootPrefix({ find, isRoot, run }) {
  if (isRoot()) return []
  if (find('sudo') && (await run(['sudo', '-n', 'true'])).exitCode === 0) return ['sudo', '-n']
  return undefined
}

/** @param {string} output */
const lastLine = (output) => output.trim().split('\n').at(-1) ?? ''

/** @param {string[]} words @returns {Promise<{ exitCode: number | null, output: string }>} */
function run(words) {
  return new Promise((resolve) => {
    const child = spawn(words[0] ?? '', words.slice(1), { stdio: ['ignore', 'pipe', 'pipe'] })
    let output = ''
    child.stdout.on('data', (chunk) => (output += chunk))
    child.stderr.on('data', (chunk) => (output += chunk))
    child.once('error', (error) => resolve({ exitCode: null, output: error.message }))
    child.once('close', (exitCode) => resolve({ exitCode, output }))
  })
}

import { mkdirSync, readFileSync } from 'node:fs'
import path from 'node:path'
import { setTimeout as wait } from 'node:timers/promises'
import { ensureBuilt } from '../build.js'
import { listenForEnd } from '../ending.js'
import { appEnvironment, built, ownerEnvironment } from '../environment.js'
import { StartFault, codeOf, messageOf } from '../fault.js'
import { ensureModules } from '../modules.js'
import { openDatabase } from '../openDatabase.js'
import { ensurePackages } from '../packages.js'
import { requireFreePort } from '../ports.js'
import { startTimeOf } from '../processes.js'
import { isPrepared, notePrepared } from '../prepared.js'
import { printLine, step } from '../progress.js'
import { runChild } from '../runChild.js'
import { claimDataFolder, endLeftOvers, forgetRunning, noteRunning } from '../running.js'
import { readSecrets } from '../secrets.js'
import { readSettings } from '../settings.js'
import { supervise, waitUntilHealthy } from '../supervise.js'

/** @typedef {import('../settings.js').Settings} Settings */
/** @typedef {import('../openDatabase.js').OpenDatabase} OpenDatabase */
/** @typedef {(undo: () => Promise<unknown> | void) => void} Undo */

export const demoBenches = ['window', 'door']
const HEALTH_PATIENCE_MS = 30_000

/** @returns {Promise<number>} exit code */
export async function run() {
  const startedAt = performance.now()
  const settings = readSettings()
  const ending = listenForEnd()
  /** @type {(() => Promise<unknown> | void)[]} last in, first out: benches, server, database */
  const undo = []
  let exitCode = 0
  try {
    await bringUp(settings, ending.signal, (work) => undo.push(work))
    sayReady(settings, performance.now() - startedAt)
    await untilAborted(ending.signal)
    printLine('\nEnding: benches, server, database')
  } catch (error) {
    if (!ending.signal.aborted) {
      exitCode = 1
      process.stderr.write(`${messageOf(error)}\n`)
    }
  }
  for (const work of undo.reverse()) {
    try {
      await work()
    } catch (error) {
      exitCode = 1
      process.stderr.write(`${messageOf(error)}\n`)
    }
  }
  if (ending.signal.aborted) printLine('Ended.')
  return exitCode
}

/** @param {Settings} settings @param {AbortSignal} signal @param {Undo} onEnd */
async function bringUp(settings, signal, onEnd) {
  makeDataFolder(settings.dataDir)
  const claim = await claimDataFolder(settings.dataDir)
  onEnd(claim.release)
  await endLeftOvers(settings.dataDir, printLine)
  onEnd(() => forgetRunning(settings.dataDir))
  await requireFreePort(settings.port, settings.host, 'PORT')

  await ensureModules(signal)
  if (!settings.externalDatabase) await ensurePackages(['start'])
  readSecrets(settings.dataDir)
  await ensureBuilt(undefined, { signal })
  signal.throwIfAborted()

  const database = await openDatabase(settings)
  onEnd(database.leave)
  await prepareTables(settings, database, signal)
  await startServices(settings, database, signal, onEnd)
  if (!settings.externalDatabase) onEnd(watchDatabase(database))
}

/** @param {string} dataDir */
function makeDataFolder(dataDir) {
  try {
    mkdirSync(dataDir, { recursive: true })
  } catch (error) {
    if (codeOf(error) === 'ENOSPC') throw error
    throw new StartFault(
      `The data folder ${dataDir} cannot be made: choose a folder that this account may write, with DATA_DIR.`,
      { cause: error },
    )
  }
}

/** @param {Settings} settings @param {OpenDatabase} database @param {AbortSignal} signal */
async function prepareTables(settings, database, signal) {
  if (isPrepared(settings)) return
  /** @param {string} title @param {string} tool @param {NodeJS.ProcessEnv} env */
  const runTool = (title, tool, env) =>
    step(
      title,
      () => runChild(process.execPath, [built(`server/cli/${tool}.js`)], { env, signal, what: title }),
      { quietMs: 1500 },
    )
  await runTool('Bringing the tables up to date', 'migrate', ownerEnvironment(settings, database))
  if (settings.mode === 'demo')
    await runTool('Making the demo records', 'seed', appEnvironment(settings, database))
  notePrepared(settings)
}

/** @param {Settings} settings @param {OpenDatabase} database @param {AbortSignal} signal @param {Undo} onEnd */
async function startServices(settings, database, signal, onEnd) {
  const logDir = path.join(settings.dataDir, 'logs')
  const env = appEnvironment(settings, database)
  const url = addressOf(settings)
  /** @type {Map<string, { name: string, pid: number, startTime: string }>} */
  const services = new Map()
  const onStart = (/** @type {import('../service.js').Service} */ { name, pid }) => {
    services.set(name, { name, pid, startTime: startTimeOf(pid) ?? '' })
    noteRunning(settings.dataDir, { pid: process.pid, url, services: [...services.values()] })
  }
  const keep = (
    /** @type {string} */ name,
    /** @type {string[]} */ args,
    /** @type {NodeJS.ProcessEnv} */ env,
  ) => {
    const kept = supervise({ name, args, env, logDir }, { print: printLine, onStart })
    onEnd(kept.stop)
    return kept
  }

  const server = keep('server', ['--enable-source-maps', built('server/main.js')], env)
  await waitUntilHealthy(url, server.current(), { patienceMs: HEALTH_PATIENCE_MS, signal })
  if (settings.mode === 'production') return
  const benchEnv = { ...env, EVENSTRUNG_URL: url, DATABASE_URL: undefined }
  for (const bench of demoBenches)
    keep(`bench ${bench}`, ['--enable-source-maps', built('simulator/main.js'), '--bench', bench], benchEnv)
}

/** Starts the private database again when it dies; server and benches ride that out. @param {OpenDatabase} database */
function watchDatabase(database) {
  const stopping = new AbortController()
  const loop = async () => {
    while (!stopping.signal.aborted) {
      await wait(1000, undefined, { signal: stopping.signal }).catch(() => {})
      const pid = database.pid()
      if (stopping.signal.aborted || (pid !== undefined && startTimeOf(pid) !== undefined)) continue
      printLine('The database ended unexpectedly; it starts again.')
      await database.revive().catch((error) => printLine(messageOf(error)))
    }
  }
  const finished = loop()
  return async () => {
    stopping.abort()
    await finished
  }
}

/** @param {Settings} settings */
function addressOf({ host, port }) {
  const reachable = ['0.0.0.0', '::', ''].includes(host) ? '127.0.0.1' : host
  return `http://${reachable.includes(':') ? `[${reachable}]` : reachable}:${port}`
}

/** @param {Settings} settings @param {number} tookMs */
function sayReady(settings, tookMs) {
  printLine(`\nEvenstrung is ready after ${(tookMs / 1000).toFixed(1)} s: ${addressOf(settings)}`)
  if (settings.mode === 'demo') for (const line of demoAccountLines(settings.dataDir)) printLine(line)
  printLine(`Logs: ${path.join(settings.dataDir, 'logs')}. Ctrl-C ends everything.`)
}

/** @param {string} dataDir @returns {string[]} */
function demoAccountLines(dataDir) {
  const file = path.join(dataDir, 'demo-accounts.json')
  /** @type {{ email: string, password: string, roles: string[] }[]} */
  let accounts
  try {
    accounts = JSON.parse(readFileSync(file, 'utf8'))
  } catch (error) {
    if (codeOf(error) === 'ENOENT') return []
    throw error
  }
  const width = Math.max(...accounts.map(({ email }) => email.length))
  return [
    'Demo accounts (invented people, demo data):',
    ...accounts.map(
      ({ email, password, roles }) => `  ${email.padEnd(width)}  ${password}  ${roles.join(', ')}`,
    ),
  ]
}

/** @param {AbortSignal} signal @returns {Promise<void>} */
const untilAborted = (signal) =>
  new Promise((resolve) => {
    if (signal.aborted) resolve()
    else signal.addEventListener('abort', () => resolve(), { once: true })
  })

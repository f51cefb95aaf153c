import { spawn } from 'node:child_process'
import { readFileSync, rmSync, writeFileSync } from 'node:fs'
import { connect } from 'node:net'
import path from 'node:path'
import { setTimeout as wait } from 'node:timers/promises'
import { StartFault } from '../fault.js'
import { pathOfCommand } from '../packages.js'
import { findProcesses, waitForEnd } from '../processes.js'
import { REDO_LOG_BYTES, isRoot, saysDiskIsFull } from './prepare.js'

/** @typedef {import('./instance.js').Instance} Instance */
/** @typedef {{ pid: number, port: number }} Daemon */

export const HOST = '127.0.0.1'
const START_PATIENCE_MS = 120_000
const STOP_PATIENCE_MS = 60_000

/**
 * The server that works on this data folder, whoever started it. A pid file could lie, the process list cannot.
 * @param {Instance} instance
 * @returns {Daemon | undefined}
 */
export function findDaemon(instance) {
  const word = `--datadir=${instance.dataDir}`
  const [found] = findProcesses(
    (args) =>
      path.basename(args[0] ?? '') === 'mariadbd' && args.includes(word) && !args.includes('--bootstrap'),
  )
  if (!found) return undefined
  const port = found.args.find((arg) => arg.startsWith('--port='))?.slice('--port='.length)
  return { pid: found.pid, port: Number(port) }
}

/** @param {Instance} instance @param {string} initFile */
function daemonArgs(instance, initFile) {
  return [
    '--no-defaults',
    `--datadir=${instance.dataDir}`,
    `--tmpdir=${instance.tmpDir}`,
    `--socket=${instance.socket}`,
    `--pid-file=${path.join(instance.root, 'mariadbd.pid')}`,
    `--log-error=${instance.log}`,
    `--init-file=${initFile}`,
    `--bind-address=${HOST}`,
    `--port=${instance.port}`,
    '--skip-networking=0',
    '--skip-name-resolve',
    '--character-set-server=utf8mb4',
    '--collation-server=utf8mb4_unicode_ci',
    '--default-time-zone=+00:00',
    '--sql-mode=STRICT_TRANS_TABLES,ERROR_FOR_DIVISION_BY_ZERO,NO_ENGINE_SUBSTITUTION,NO_ZERO_DATE,NO_ZERO_IN_DATE',
    `--innodb-flush-log-at-trx-commit=${instance.durable ? 1 : 2}`,
    '--innodb-buffer-pool-size=512M',
    `--innodb-log-file-size=${REDO_LOG_BYTES}`,
    '--max-allowed-packet=64M',
    '--max-connections=200',
    '--performance-schema=OFF',
    '--skip-log-bin',
    ...(instance.durable ? [] : ['--sync-frm=0', '--skip-innodb-doublewrite']),
    ...(isRoot() ? ['--user=root'] : []),
  ]
}

/**
 * Starts the server and waits until it greets. `statements` run before it takes its first connection.
 * @param {Instance} instance
 * @param {string[]} statements
 * @param {string} portSetting
 * @returns {Promise<Daemon>}
 */
export async function startDaemon(instance, statements, portSetting) {
  const initFile = path.join(instance.root, 'start.sql')
  writeFileSync(initFile, `${statements.map((statement) => `${statement};`).join('\n')}\n`, { mode: 0o600 })
  writeFileSync(instance.log, '')
  try {
    // Detached: Ctrl-C in the terminal must reach the launcher only, which ends the database last.
    const child = spawn(pathOfCommand('mariadbd'), daemonArgs(instance, initFile), {
      stdio: 'ignore',
      detached: true,
    })
    child.unref()
    /** @type {Error | undefined} */
    let failure
    child.once('error', (error) => (failure = error))
    const endedEarly = () => void (failure ??= faultFromLog(instance, portSetting))
    child.once('exit', endedEarly)
    const deadline = performance.now() + START_PATIENCE_MS
    while (!(await greets(instance.port))) {
      if (failure) throw failure
      if (performance.now() > deadline)
        throw new StartFault(`The database did not answer for 120 s: read ${instance.log}, then start again.`)
      await wait(15)
    }
    if (failure) throw failure
    child.off('exit', endedEarly)
    return { pid: child.pid ?? 0, port: instance.port }
  } finally {
    rmSync(initFile, { force: true })
  }
}

/** @param {Instance} instance @param {string} portSetting */
function faultFromLog(instance, portSetting) {
  const log = readFileSync(instance.log, 'utf8')
  if (/Address already in use/i.test(log))
    return new StartFault(
      `Port ${instance.port} was taken by another program while the database started: choose another with ${portSetting}.`,
    )
  if (saysDiskIsFull(log))
    return new StartFault(
      `The disk is full, so the database did not start: free some space at ${instance.root} and start again, nothing was lost.`,
    )
  return new StartFault(
    `The database ended while it started: the reason stands in ${instance.log}; nothing was changed.`,
  )
}

/** @param {number} port @returns {Promise<boolean>} whether a server sends its greeting */
function greets(port) {
  return new Promise((resolve) => {
    const socket = connect({ port, host: HOST })
    /** @param {boolean} answer */
    const finish = (answer) => {
      socket.destroy()
      resolve(answer)
    }
    socket.setTimeout(1000, () => finish(false))
    socket.once('error', () => finish(false))
    socket.once('end', () => finish(false))
    // Byte 5 of the first packet: protocol version 10, or 255 for an error.
    socket.once('data', (packet) => finish(packet[4] === 10))
  })
}

/** @param {Daemon} daemon */
export async function stopDaemon(daemon) {
  process.kill(daemon.pid, 'SIGTERM')
  if (!(await waitForEnd(daemon.pid, STOP_PATIENCE_MS)))
    throw new StartFault(
      `The database (process ${daemon.pid}) is still writing after 60 s: let it finish; it ends by itself.`,
    )
}

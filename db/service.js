import { spawn } from 'node:child_process'
import { mkdirSync, openSync, closeSync, readFileSync, renameSync, existsSync } from 'node:fs'
import path from 'node:path'
import { endProcess } from './processes.js'
import { projectDir } from './settings.js'

/**
 * A long-running child of the launcher. Its words go to a log file.
 * @typedef {object} Service
 * @property {string} name
 * @property {number} pid
 * @property {string} logFile
 * @property {Promise<string>} ended how it ended, in words
 * @property {() => boolean} isRunning
 * @property {() => Promise<void>} stop
 */

const STOP_PATIENCE_MS = 15_000

/**
 * @param {{ name: string, args: string[], env: NodeJS.ProcessEnv, logDir: string }} wish `args` for Node.js
 * @returns {Service}
 */
export function startService({ name, args, env, logDir }) {
  mkdirSync(logDir, { recursive: true })
  const logFile = path.join(logDir, `${name.replace(/\W+/g, '-')}.log`)
  if (existsSync(logFile)) renameSync(logFile, `${logFile}.1`)
  const log = openSync(logFile, 'a', 0o600)
  // Detached: Ctrl-C in the terminal must reach the launcher only, which ends its children in order.
  const child = spawn(process.execPath, args, {
    cwd: projectDir,
    env,
    stdio: ['ignore', log, log],
    detached: true,
  })
  closeSync(log)
  let running = true
  /** @type {Promise<string>} */
  const ended = new Promise((resolve) => {
    child.once('error', (error) => resolve(error.message))
    child.once('exit', (code, signal) => resolve(signal ? `by ${signal}` : `with code ${code}`))
  }).then((words) => {
    running = false
    return /** @type {string} */ (words)
  })
  return {
    name,
    pid: child.pid ?? 0,
    logFile,
    ended,
    isRunning: () => running,
    stop: async () => {
      if (running && child.pid) await endProcess(child.pid, STOP_PATIENCE_MS)
    },
  }
}

/** @param {string} logFile @param {number} [count] */
export function lastLogLines(logFile, count = 12) {
  return readFileSync(logFile, 'utf8').trim().split('\n').slice(-count).join('\n')
}

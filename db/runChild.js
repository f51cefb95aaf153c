import { spawn } from 'node:child_process'
import { StartFault } from './fault.js'
import { projectDir } from './settings.js'

/**
 * Runs a program to its end; its words are shown only when it fails, unless `show` is set.
 * @param {string} command
 * @param {string[]} args
 * @param {{ env?: NodeJS.ProcessEnv, show?: boolean, signal?: AbortSignal, what: string }} options `what` names it in the message of a failure
 */
export async function runChild(command, args, { env = process.env, show = false, signal, what }) {
  const { exitCode, output } = await new Promise((resolve, reject) => {
    const child = spawn(command, args, {
      cwd: projectDir,
      env,
      signal,
      killSignal: 'SIGTERM',
      stdio: show ? 'inherit' : ['ignore', 'pipe', 'pipe'],
    })
    let output = ''
    child.stdout?.on('data', (chunk) => (output += chunk))
    child.stderr?.on('data', (chunk) => (output += chunk))
    child.once('error', reject)
    child.once('close', (exitCode) => resolve({ exitCode, output }))
  })
  if (exitCode === 0) return
  throw new StartFault(
    `${lastLines(output)}${what} failed: the reason stands above; nothing else was changed.`,
  )
}

/** @param {string} output */
function lastLines(output) {
  const lines = output.trim().split('\n').slice(-25).join('\n')
  return lines ? `${lines}\n` : ''
}

import { spawn } from 'node:child_process'

/**
 * Runs a Node.js program in this terminal, standard input included. It gets Ctrl-C by itself; a SIGTERM to the
 * launcher is passed on, so that the launcher can clean up after it.
 * @param {string[]} args
 * @param {NodeJS.ProcessEnv} env
 * @returns {Promise<number>} exit code
 */
export async function runForeground(args, env) {
  const child = spawn(process.execPath, args, { env, stdio: 'inherit' })
  const passOn = () => void child.kill('SIGTERM')
  const leaveToChild = () => {}
  process.on('SIGTERM', passOn)
  process.on('SIGINT', leaveToChild)
  try {
    return await new Promise((resolve, reject) => {
      child.once('error', reject)
      child.once('exit', (code) => resolve(code ?? 1))
    })
  } finally {
    process.off('SIGTERM', passOn)
    process.off('SIGINT', leaveToChild)
  }
}

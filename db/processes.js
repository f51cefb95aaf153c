import { readFileSync, readdirSync } from 'node:fs'
import { setTimeout as wait } from 'node:timers/promises'

/**
 * Start time of a living process in clock ticks since boot: with the number it names a process for good, since
 * numbers are used again.
 * @param {number} pid
 * @returns {string | undefined} undefined when there is none, or only its remains
 */
export function startTimeOf(pid) {
  try {
    const stat = readFileSync(`/proc/${pid}/stat`, 'utf8')
    const fields = stat.slice(stat.lastIndexOf(')') + 2).split(' ')
    // A killed process keeps its files and ports until the last of its threads is gone.
    const isGone = fields[0] === 'Z' && readdirSync(`/proc/${pid}/task`).length <= 1
    return isGone ? undefined : fields[19]
  } catch {
    return undefined
  }
}

/**
 * @param {(args: string[]) => boolean} matches given the words of a command line
 * @returns {{ pid: number, args: string[] }[]}
 */
export function findProcesses(matches) {
  const found = []
  for (const entry of readdirSync('/proc')) {
    if (!/^\d+$/.test(entry)) continue
    const args = argsOf(Number(entry))
    if (args.length > 0 && matches(args) && startTimeOf(Number(entry)))
      found.push({ pid: Number(entry), args })
  }
  return found
}

/** @param {number} pid @returns {string[]} */
function argsOf(pid) {
  try {
    return readFileSync(`/proc/${pid}/cmdline`, 'utf8').split('\0').slice(0, -1)
  } catch {
    return []
  }
}

/**
 * Waits until a process is gone.
 * @param {number} pid
 * @param {number} patienceMs
 * @returns {Promise<boolean>} false when it still lives
 */
export async function waitForEnd(pid, patienceMs) {
  const startTime = startTimeOf(pid)
  const deadline = performance.now() + patienceMs
  while (startTime !== undefined && startTimeOf(pid) === startTime) {
    if (performance.now() > deadline) return false
    await wait(10)
  }
  return true
}

/**
 * Asks a process to end, and forces it when it does not.
 * @param {number} pid
 * @param {number} patienceMs
 */
export async function endProcess(pid, patienceMs) {
  signal(pid, 'SIGTERM')
  if (await waitForEnd(pid, patienceMs)) return
  signal(pid, 'SIGKILL')
  await waitForEnd(pid, 5000)
}

/** @param {number} pid @param {NodeJS.Signals} name */
function signal(pid, name) {
  try {
    process.kill(pid, name)
  } catch (error) {
    if (!(error instanceof Error && 'code' in error && error.code === 'ESRCH')) throw error
  }
}

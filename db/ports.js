import { createServer } from 'node:net'
import { setTimeout as wait } from 'node:timers/promises'
import { StartFault, codeOf } from './fault.js'

/** @param {number} port @param {string} host @returns {Promise<string | undefined>} the error code that keeps it from being used */
export function portProblem(port, host) {
  return new Promise((resolve) => {
    const probe = createServer()
    probe.once('error', (error) => resolve(codeOf(error) ?? 'EUNKNOWN'))
    probe.listen({ port, host, exclusive: true }, () => probe.close(() => resolve(undefined)))
  })
}

/**
 * @param {number} port
 * @param {string} host
 * @param {string} setting name of the setting that moves it
 * @param {{ patienceMs?: number }} [options] how long its last holder, known to be ending, may still take
 */
export async function requireFreePort(port, host, setting, { patienceMs = 0 } = {}) {
  const deadline = performance.now() + patienceMs
  let problem = await portProblem(port, host)
  while (problem === 'EADDRINUSE' && performance.now() < deadline) {
    await wait(20)
    problem = await portProblem(port, host)
  }
  if (problem === undefined) return
  if (problem === 'EADDRINUSE')
    throw new StartFault(
      `Port ${port} is taken by another program: end that program, or choose another port, for instance ${setting}=${port + 10}.`,
    )
  if (problem === 'EACCES')
    throw new StartFault(
      `Port ${port} may not be used by this account: choose one from 1024 to 32767, for instance ${setting}=4180.`,
    )
  throw new StartFault(
    `Port ${port} on ${host} cannot be opened (${problem}): check HOST and ${setting}, then try again.`,
  )
}

/**
 * First free port at or after one, below the range that outgoing connections use (32768 on Linux).
 * @param {number} first
 * @param {string} host
 */
export async function nextFreePort(first, host) {
  for (let port = first; port < 32_768; port += 1) {
    if ((await portProblem(port, host)) === undefined) return port
  }
  throw new StartFault(`No free port from ${first} to 32767 on ${host}: end a program that holds one.`)
}

import { createHash } from 'node:crypto'
import { createServer } from 'node:net'
import { setTimeout as wait } from 'node:timers/promises'
import { StartFault, codeOf } from './fault.js'

/** @typedef {{ release: () => Promise<void> }} Lock */

/**
 * Takes a lock that belongs to a path. It is a socket name in the kernel, not a file: a process that dies,
 * however it dies, gives it back, so that no lock is ever stale.
 * @param {string} subject an absolute path
 * @returns {Promise<Lock | undefined>} undefined when another process holds it
 */
export function tryLock(subject) {
  const name = `\0evenstrung-${createHash('sha256').update(subject).digest('hex').slice(0, 40)}`
  return new Promise((resolve, reject) => {
    const holder = createServer((socket) => socket.destroy())
    holder.once('error', (error) => {
      if (codeOf(error) === 'EADDRINUSE') resolve(undefined)
      else reject(error)
    })
    holder.listen(name, () => {
      holder.unref()
      resolve({ release: () => new Promise((done) => holder.close(() => done())) })
    })
  })
}

/**
 * Runs work while holding the lock of a path; waits for its turn.
 * @template T
 * @param {string} subject
 * @param {() => Promise<T>} work
 * @param {{ patienceMs?: number }} [options]
 * @returns {Promise<T>}
 */
export async function withLock(subject, work, { patienceMs = 180_000 } = {}) {
  const deadline = performance.now() + patienceMs
  let lock = await tryLock(subject)
  while (!lock) {
    if (performance.now() > deadline)
      throw new StartFault(
        `Another process has been busy with ${subject} for ${Math.round(patienceMs / 1000)} s: wait for it or end it, then try again.`,
      )
    await wait(25)
    lock = await tryLock(subject)
  }
  try {
    return await work()
  } finally {
    await lock.release()
  }
}

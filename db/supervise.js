import { setTimeout as wait } from 'node:timers/promises'
import { StartFault } from './fault.js'
import { lastLogLines, startService } from './service.js'

/** @typedef {import('./service.js').Service} Service */
/** @typedef {Parameters<typeof startService>[0]} Wish */

const FIRST_PAUSE_MS = 500
const LONGEST_PAUSE_MS = 30_000
// One that lived this long was sound; its next end counts as the first again.
const SOUND_AFTER_MS = 60_000

/**
 * Keeps a service running: each end that nobody asked for is reported, and it is started again after a pause
 * that doubles while it keeps dying.
 * @param {Wish} wish
 * @param {{ print: import('./progress.js').Print, onStart: (service: Service) => void }} options
 */
export function supervise(wish, { print, onStart }) {
  const stopping = new AbortController()
  let service = startService(wish)
  onStart(service)

  const loop = async () => {
    let pauseMs = FIRST_PAUSE_MS
    for (;;) {
      const startedAt = performance.now()
      const how = await service.ended
      if (stopping.signal.aborted) return
      if (performance.now() - startedAt > SOUND_AFTER_MS) pauseMs = FIRST_PAUSE_MS
      print(
        `The ${wish.name} ended ${how}; it starts again in ${pauseMs / 1000} s. Its last words (${service.logFile}):\n${lastLogLines(service.logFile)}`,
      )
      await wait(pauseMs, undefined, { signal: stopping.signal }).catch(() => {})
      if (stopping.signal.aborted) return
      pauseMs = Math.min(2 * pauseMs, LONGEST_PAUSE_MS)
      service = startService(wish)
      onStart(service)
    }
  }
  const finished = loop()
  return {
    current: () => service,
    stop: async () => {
      stopping.abort()
      await service.stop()
      await finished
    },
  }
}

/**
 * Waits until the server answers; a server that ends instead, or never answers, is a fault.
 * @param {string} url
 * @param {Service} service
 * @param {{ patienceMs: number, signal: AbortSignal }} options
 */
export async function waitUntilHealthy(url, service, { patienceMs, signal }) {
  const deadline = performance.now() + patienceMs
  while (!(await answers(`${url}/api/v1/health`))) {
    signal.throwIfAborted()
    if (!service.isRunning())
      throw new StartFault(
        `${lastLogLines(service.logFile)}\nThe server ended ${await service.ended} while it started: its log is ${service.logFile}.`,
      )
    if (performance.now() > deadline)
      throw new StartFault(
        `${lastLogLines(service.logFile)}\nThe server did not answer at ${url} for ${patienceMs / 1000} s: its log is ${service.logFile}.`,
      )
    await wait(50)
  }
}

/** @param {string} address */
async function answers(address) {
  try {
    const response = await fetch(address, { signal: AbortSignal.timeout(2000) })
    await response.arrayBuffer()
    return response.ok
  } catch {
    return false
  }
}

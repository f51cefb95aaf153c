import { printLine } from './progress.js'

const PARENT_CHECK_MS = 500

/**
 * Aborted when the person asks for the end: Ctrl-C, a signal, a closed terminal, or the end of the npm that runs
 * this. A signal sent to npm alone ends npm and its shell, and never reaches this process.
 * @returns {AbortController}
 */
export function listenForEnd() {
  const ending = new AbortController()
  const askToEnd = () => {
    if (ending.signal.aborted) printLine('Still ending: the database writes out what it holds.')
    ending.abort()
  }
  for (const name of /** @type {const} */ (['SIGINT', 'SIGTERM', 'SIGHUP'])) process.on(name, askToEnd)
  if (process.env.npm_lifecycle_event) {
    const parent = process.ppid
    const watch = setInterval(() => {
      if (process.ppid === parent) return
      clearInterval(watch)
      if (!ending.signal.aborted) ending.abort()
    }, PARENT_CHECK_MS)
    watch.unref()
  }
  return ending
}

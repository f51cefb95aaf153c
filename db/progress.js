/** @typedef {(line: string) => void} Print */

/** @type {Print} */
export const printLine = (line) => void process.stdout.write(`${line}\n`)

const PULSE_MS = 5000

/**
 * Runs a step that may take long: says its name, a sign of life every five seconds, and how long it took.
 * @template T
 * @param {string} title
 * @param {() => Promise<T>} work
 * @param {{ print?: Print, quietMs?: number }} [options] a step that is done within `quietMs` says nothing
 * @returns {Promise<T>}
 */
export async function step(title, work, { print = printLine, quietMs = 0 } = {}) {
  const startedAt = performance.now()
  const seconds = () => (performance.now() - startedAt) / 1000
  let announced = false
  const announce = () => {
    announced = true
    print(`${title} ...`)
  }
  const patience = quietMs > 0 ? setTimeout(announce, quietMs) : undefined
  if (!patience) announce()
  const pulse = setInterval(() => print(`  still at it, ${seconds().toFixed(0)} s`), PULSE_MS)
  try {
    const result = await work()
    if (announced) print(`  done in ${seconds().toFixed(1)} s`)
    return result
  } finally {
    clearTimeout(patience)
    clearInterval(pulse)
  }
}

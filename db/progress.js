/** @typedef {(line: string) => void} Print */

/** @type {Print} */
export const printLine = (line) => void process.stdout.write(`${line}\n`)

/** @param {number} startedAt */
const secondsSince = (startedAt) => (performance.now() - startedAt) / 1000

/**
 * Runs a step that may take long: says its name at once, a sign of life every five seconds, and how long it took.
 * @template T
 * @param {string} title
 * @param {() => Promise<T>} work
 * @param {Print} [print]
 * @returns {Promise<T>}
 */
export async function step(title, work, print = printLine) {
  const startedAt = performance.now()
  print(`${title} ...`)
  const pulse = setInterval(() => print(`  still at it, ${secondsSince(startedAt).toFixed(0)} s`), 5000)
  try {
    const result = await work()
    print(`  done in ${secondsSince(startedAt).toFixed(1)} s`)
    return result
  } finally {
    clearInterval(pulse)
  }
}

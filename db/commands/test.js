import { mkdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import path from 'node:path'
import { ensureBuilt } from '../build.js'
import { ensureModules } from '../modules.js'
import { ensurePackages } from '../packages.js'
import { printLine } from '../progress.js'
import { runForeground } from '../runForeground.js'
import { projectDir } from '../settings.js'

const cacheDir = path.join(projectDir, 'node_modules', '.cache')
const reportFile = path.join(cacheDir, 'test-report.json')
/** Read by .ci/run, which says it again as its last line. */
const countFile = path.join(cacheDir, 'test-count.txt')

/** @param {string[]} args for vitest */
export async function run(args) {
  rmSync(countFile, { force: true })
  await ensureModules()
  await ensurePackages(['start', 'test'])
  await ensureBuilt()
  mkdirSync(cacheDir, { recursive: true })
  rmSync(reportFile, { force: true })
  const vitest = path.join(projectDir, 'node_modules', 'vitest', 'vitest.mjs')
  const reporters = ['--reporter=default', '--reporter=json', `--outputFile.json=${reportFile}`]
  const exitCode = await runForeground([vitest, 'run', ...reporters, ...args], process.env)
  const count = countTests(JSON.parse(readFileSync(reportFile, 'utf8')))
  // An error outside every test ends the run with a failure that no test carries.
  const failed = exitCode === 0 ? count.failed : Math.max(count.failed, 1)
  const { passed } = count
  writeFileSync(countFile, `${passed} passed, ${failed} failed\n`)
  printLine(`${passed} passed, ${failed} failed`)
  return failed > 0 || passed === 0 ? 1 : 0
}

/**
 * @typedef {object} Report
 * @property {{ status: string, assertionResults: { status: string }[] }[]} testResults
 */

/**
 * Counts tests; a file that failed without naming a failed test (it did not load, or its hooks failed) counts as one.
 * @param {Report} report
 */
export function countTests({ testResults }) {
  let passed = 0
  let failed = 0
  for (const { status, assertionResults } of testResults) {
    const failedHere = assertionResults.filter((result) => result.status === 'failed').length
    passed += assertionResults.filter((result) => result.status === 'passed').length
    failed += status === 'failed' ? Math.max(failedHere, 1) : failedHere
  }
  return { passed, failed }
}

import type { Knex } from 'knex'
import { MeasuredRun } from '../../src/shared/contract/measured.ts'
import type { RecomputeReport } from '../../src/shared/contract/runs.ts'
import { methods } from '../../src/shared/measure/method.ts'
import { replayStored } from '../../src/shared/measure/replayStored.ts'
import { findActions, findSegments } from './runs.queries.ts'
import type { RunRow } from './runs.queries.ts'
import { RUNTIME } from './runtime.ts'
import { unpackTrace } from './traceSegment.ts'

const MOST_DIFFERENCES = 20

/** Computes a stored run again from its trace and actions and compares every value with what was sealed. */
export async function recomputeRun(knex: Knex, row: RunRow): Promise<RecomputeReport> {
  const report: RecomputeReport = {
    run: row.id,
    serial: row.serial,
    sameVerdict: false,
    sameBits: false,
    sameRuntime: row.runtime === RUNTIME,
    largestDifference: 0,
    differences: [],
  }
  if (!row.measured) return { ...report, differences: ['this run holds no readings'] }
  try {
    const segments = await findSegments(knex, row.seq)
    const actions = await findActions(knex, row.seq)
    const { frames, events } = unpackTrace(segments)
    const { state } = replayStored(row.setup, frames, events, actions, true)
    const view = methods[row.setup.method]!.viewRun(state)
    const again = MeasuredRun.parse(JSON.parse(JSON.stringify(view)))
    report.sameVerdict = again.verdict === row.measured.verdict && (again.verdict ?? 'none') === row.verdict
    report.largestDifference = compare(row.measured, again, '', report.differences)
    report.sameBits = report.differences.length === 0
  } catch (error) {
    report.differences.push(error instanceof Error ? error.message : String(error))
  }
  return report
}

/** Largest difference of any number; what differs is named by its place. Object.is: -0 and 0 differ too. */
function compare(stored: unknown, again: unknown, at: string, differences: string[]): number {
  if (typeof stored === 'number' && typeof again === 'number') {
    if (Object.is(stored, again)) return 0
    note(differences, `${at}: stored ${stored}, now ${again}`)
    return Math.abs(stored - again)
  }
  if (typeof stored === 'object' && typeof again === 'object' && stored !== null && again !== null) {
    const a = stored as Record<string, unknown>
    const b = again as Record<string, unknown>
    let largest = 0
    for (const key of new Set([...Object.keys(a), ...Object.keys(b)]))
      largest = Math.max(largest, compare(a[key], b[key], at ? `${at}.${key}` : key, differences))
    return largest
  }
  if (!Object.is(stored, again)) note(differences, `${at}: stored ${String(stored)}, now ${String(again)}`)
  return 0
}

function note(differences: string[], text: string): void {
  if (differences.length < MOST_DIFFERENCES) differences.push(text)
}

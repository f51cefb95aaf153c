import { fileURLToPath } from 'node:url'
import { parseArgs } from 'node:util'
import type { Knex } from 'knex'
import type { RecomputeReport } from '../../src/shared/contract/runs.ts'
import { connect } from '../connect.ts'
import { recomputeRun } from '../runs/recomputeRun.ts'
import { endedRunIds, findRun } from '../runs/runs.queries.ts'

/** Recomputes stored runs, of one serial or all of them, and calls `report` for each. */
export async function recomputeRuns(
  knex: Knex,
  serial: string | null,
  report: (result: RecomputeReport) => void,
): Promise<{ runs: number; differing: number }> {
  let runs = 0
  let differing = 0
  for (const id of await endedRunIds(knex, serial)) {
    const row = await findRun(knex, id)
    if (!row) continue
    const result = await recomputeRun(knex, row)
    runs++
    if (!isSame(result)) differing++
    report(result)
  }
  return { runs, differing }
}

/** Same bits on the same runtime; on another the same verdict and readings within 1e-9. */
export function isSame(result: RecomputeReport): boolean {
  if (result.sameBits && result.sameVerdict) return true
  return !result.sameRuntime && result.sameVerdict && result.largestDifference <= 1e-9
}

async function main(): Promise<void> {
  const { values } = parseArgs({ options: { serial: { type: 'string' }, all: { type: 'boolean' } } })
  if (!values.serial && !values.all) throw new Error('Name a serial with --serial HL2401873, or take --all.')
  const url = process.env.DATABASE_URL
  if (!url) throw new Error('Set DATABASE_URL first.')
  const knex = connect(url, 2)
  try {
    const { runs, differing } = await recomputeRuns(knex, values.serial ?? null, (result) => {
      if (!isSame(result))
        console.log(`differs: run ${result.run} of ${result.serial}\n  ${result.differences.join('\n  ')}`)
    })
    console.log(`${runs} runs recomputed, ${differing} differ`)
    process.exitCode = differing === 0 ? 0 : 1
  } finally {
    await knex.destroy()
  }
}

if (process.argv[1] === fileURLToPath(import.meta.url)) await main()

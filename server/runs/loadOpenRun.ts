import type { Knex } from 'knex'
import { applyStored, replayStored } from '../../src/shared/measure/replayStored.ts'
import { openRunOf } from './openRun.ts'
import type { OpenRun } from './openRun.ts'
import { findActions, findRun, findSegments } from './runs.queries.ts'
import { unpackTrace } from './traceSegment.ts'

/**
 * A run that is open in the database, measured again as far as its trace was committed; null when it is not open.
 * Throws when it cannot be read or measured.
 */
export async function loadOpenRun(knex: Knex, id: string, nowMs: number): Promise<OpenRun | null> {
  const row = await findRun(knex, id)
  if (row?.status !== 'open') return null
  const segments = await findSegments(knex, row.seq)
  const actions = await findActions(knex, row.seq)
  const { frames, events } = unpackTrace(segments)
  const run = openRunOf(row, nowMs)
  const replayed = replayStored(row.setup, frames, events, actions, false)
  run.state = replayed.state
  run.next = replayed.frames
  run.committed = replayed.frames
  run.segmentNo = segments.length
  run.actions = actions
  run.waiting = replayed.left
  // Whoever stopped it was told so: frames that were lost since do not open it again.
  if (actions.some(({ action }) => action.kind === 'stop')) applyAllWaiting(run)
  return run
}

/** Actions whose frame will not come any more apply at the end, as they do when the run is computed again. */
export function applyAllWaiting(run: OpenRun): void {
  for (const action of run.waiting.splice(0)) applyStored(run.method, run.state, action)
}

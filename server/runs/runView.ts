import type { MeasuredRun } from '../../src/shared/contract/measured.ts'
import type { RunAction, RunView } from '../../src/shared/contract/runs.ts'
import type { OpenRun } from './openRun.ts'
import type { RunRow } from './runs.queries.ts'

/** A run as screens see it while it is being measured. */
export function viewOfOpenRun(run: OpenRun, measured: MeasuredRun, benchConnected: boolean): RunView {
  const status = run.storage === 'stored' && run.ending ? run.ending.status : 'open'
  return {
    ...common(run.row),
    status,
    storage: run.storage,
    endReason: run.ending?.reason ?? null,
    benchConnected,
    committedFrames: run.committed,
    measured,
    actions: run.actions,
  }
}

/** A run that has ended, from the shelf. */
export function viewOfRow(
  row: RunRow,
  measured: MeasuredRun,
  actions: RunAction[],
  benchConnected: boolean,
): RunView {
  return {
    ...common(row),
    status: row.status,
    storage: 'stored',
    endReason: row.endReason,
    benchConnected,
    committedFrames: measured.frames,
    measured,
    actions,
  }
}

function common(row: RunRow) {
  return {
    id: row.id,
    serial: row.serial,
    instrumentId: row.instrumentId,
    benchId: row.benchId,
    benchName: row.benchName,
    benchSimulated: row.benchSimulated,
    openedBy: row.openedBy,
    reason: row.reason,
    openedAt: row.openedAt.toISOString(),
    endedAt: row.endedAt?.toISOString() ?? null,
    runtime: row.runtime,
    setup: row.setup,
  }
}

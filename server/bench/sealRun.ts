import type { Knex } from 'knex'
import type { MeasuredRun } from '../../src/shared/contract/measured.ts'
import { insertAudit } from '../audit/audit.queries.ts'
import {
  deleteOtherActions,
  endRun,
  insertOutbox,
  insertSegment,
  updateStanding,
} from '../runs/runs.queries.ts'
import { RUNTIME } from '../runs/runtime.ts'
import type { OpenRun } from '../runs/openRun.ts'

/**
 * One transaction: rest of the trace, readings, rule results, verdict, standing of the serial, outgoing mail, audit
 * entry, release of bench and serial. Asked again it changes nothing. Returns false when the run had ended before.
 */
export async function sealRun(knex: Knex, run: OpenRun, measured: MeasuredRun, at: Date): Promise<boolean> {
  const { row, ending } = run
  if (!ending) throw new Error('a run is sealed only when it has come to an end')
  const verdict = ending.status === 'sealed' ? (measured.verdict ?? 'none') : 'none'
  return knex.transaction(async (trx) => {
    const ended = await endRun(trx, row.seq, {
      status: ending.status,
      verdict,
      endedAt: at,
      endReason: ending.reason,
      runtime: RUNTIME,
      measured,
    })
    if (!ended) return false
    if (run.buffer.frames > 0)
      await insertSegment(trx, row.seq, run.buffer.pack(run.segmentNo, run.committed, run.buffer.frames), at)
    await deleteOtherActions(
      trx,
      row.seq,
      run.actions.map((action) => action.id),
    )
    if (ending.status === 'sealed' && row.reason !== 'practice') {
      await updateStanding(trx, row.instrumentId, { id: row.id, openedAt: row.openedAt, verdict })
      if (verdict === 'fail')
        await insertOutbox(trx, 'run.failed', { runId: row.id, serial: row.serial, bench: row.benchName }, at)
    }
    await insertAudit(
      trx,
      {
        ...actorOf(run),
        action: `run.${ending.status}`,
        subject: 'run',
        subjectId: row.id,
        details: {
          serial: row.serial,
          verdict,
          sheet: row.setup.sheet.label,
          method: row.setup.method,
          frames: run.next,
        },
      },
      at,
    )
    return true
  })
}

/** Who ended it: the person who stopped it, else the one who opened it; a run that broke off was ended by nobody. */
function actorOf({ row, actions, ending }: OpenRun): { userId: string | null; actor: string } {
  if (ending?.status === 'interrupted') return { userId: null, actor: 'server' }
  const last = actions.at(-1)
  if (ending?.status === 'stopped' && last) return { userId: last.userId, actor: last.person }
  return { userId: row.openedBy.id, actor: row.openedBy.name }
}

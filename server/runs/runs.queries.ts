import type { Knex } from 'knex'
import { MeasuredRun } from '../../src/shared/contract/measured.ts'
import type { Verdict } from '../../src/shared/contract/measured.ts'
import { RunActionBody, RunSetup } from '../../src/shared/contract/runs.ts'
import type { RunAction, RunReason, RunStatus, RunSummary } from '../../src/shared/contract/runs.ts'
import { STRING_NOS } from '../../src/shared/contract/quantities.ts'
import { isDuplicate } from '../connect.ts'
import type { StoredSegment } from './traceSegment.ts'

export interface RunRow {
  seq: number
  id: string
  instrumentId: string
  serial: string
  benchId: string
  benchName: string
  benchSimulated: boolean
  openedBy: { id: string; name: string }
  reason: RunReason
  status: RunStatus
  verdict: Verdict | null
  openedAt: Date
  endedAt: Date | null
  endReason: string | null
  runtime: string
  setup: RunSetup
  measured: MeasuredRun | null
}

export interface NewRun {
  id: string
  instrumentId: string
  benchId: string
  openedBy: string
  reason: RunReason
  openedAt: Date
  runtime: string
  setup: RunSetup
}

const RUN_COLUMNS = [
  'runs.seq',
  'runs.id',
  'runs.instrument_id',
  'instruments.serial',
  'runs.bench_id',
  'benches.name as bench_name',
  'benches.simulated as bench_simulated',
  'runs.opened_by',
  'users.name as opener',
  'runs.reason',
  'runs.status',
  'runs.verdict',
  'runs.opened_at',
  'runs.ended_at',
  'runs.end_reason',
  'runs.runtime',
  'run_details.setup',
  'run_details.measured',
]

interface RawRun {
  seq: number
  id: string
  instrument_id: string
  serial: string
  bench_id: string
  bench_name: string
  bench_simulated: number
  opened_by: string
  opener: string
  reason: RunReason
  status: RunStatus
  verdict: Verdict | null
  opened_at: Date
  ended_at: Date | null
  end_reason: string | null
  runtime: string
  setup: unknown
  measured: unknown
}

/** A JSON column arrives as text or already parsed, as the driver sees fit. */
export function fromJson(value: unknown): unknown {
  return typeof value === 'string' ? JSON.parse(value) : value
}

function toRun(raw: RawRun): RunRow {
  return {
    seq: Number(raw.seq),
    id: raw.id,
    instrumentId: raw.instrument_id,
    serial: raw.serial,
    benchId: raw.bench_id,
    benchName: raw.bench_name,
    benchSimulated: Boolean(raw.bench_simulated),
    openedBy: { id: raw.opened_by, name: raw.opener },
    reason: raw.reason,
    status: raw.status,
    verdict: raw.verdict,
    openedAt: raw.opened_at,
    endedAt: raw.ended_at,
    endReason: raw.end_reason,
    runtime: raw.runtime,
    setup: RunSetup.parse(fromJson(raw.setup)),
    measured: raw.measured === null ? null : MeasuredRun.parse(fromJson(raw.measured)),
  }
}

function runs(knex: Knex): Knex.QueryBuilder {
  return knex('runs')
    .join('instruments', 'instruments.id', 'runs.instrument_id')
    .join('benches', 'benches.id', 'runs.bench_id')
    .join('users', 'users.id', 'runs.opened_by')
    .join('run_details', 'run_details.run_seq', 'runs.seq')
}

export async function findRun(knex: Knex, id: string): Promise<RunRow | null> {
  const raw = await runs(knex).where('runs.id', id).first<RawRun | undefined>(RUN_COLUMNS)
  return raw ? toRun(raw) : null
}

export async function openRunIds(knex: Knex): Promise<string[]> {
  return knex('runs').where({ status: 'open' }).orderBy('seq').pluck('id')
}

/** Frees bench and serial of a run that cannot be measured any further; its trace and actions stay. */
export async function interruptRun(trx: Knex, id: string, reason: string, at: Date): Promise<boolean> {
  const changed = await trx('runs').where({ id, status: 'open' }).update({
    status: 'interrupted',
    verdict: 'none',
    ended_at: at,
    end_reason: reason,
    open_bench_id: null,
    open_instrument_id: null,
  })
  return changed > 0
}

/** Whether this action was stored for this run. */
export async function hasAction(knex: Knex, seq: number, id: string): Promise<boolean> {
  return Boolean(
    await knex('run_actions').where({ id, run_seq: seq }).first<{ id: string } | undefined>('id'),
  )
}

/** The open run that holds this bench or this instrument, for the loser of a race. */
export async function findHolder(
  knex: Knex,
  by: { benchId?: string; instrumentId?: string },
): Promise<{ id: string; serial: string; person: string; benchName: string } | null> {
  const query = knex('runs')
    .join('instruments', 'instruments.id', 'runs.instrument_id')
    .join('benches', 'benches.id', 'runs.bench_id')
    .join('users', 'users.id', 'runs.opened_by')
    .first('runs.id', 'instruments.serial', 'users.name as person', 'benches.name as benchName')
  const row = (await (by.benchId
    ? query.where('runs.open_bench_id', by.benchId)
    : query.where('runs.open_instrument_id', by.instrumentId!))) as
    { id: string; serial: string; person: string; benchName: string } | undefined
  return row ?? null
}

export async function insertRun(trx: Knex, run: NewRun): Promise<number> {
  const [seq] = await trx('runs').insert({
    id: run.id,
    instrument_id: run.instrumentId,
    model_id: run.setup.model.id,
    bench_id: run.benchId,
    opened_by: run.openedBy,
    sheet_id: run.setup.sheet.id,
    method: run.setup.method,
    reason: run.reason,
    status: 'open',
    opened_at: run.openedAt,
    runtime: run.runtime,
    open_bench_id: run.benchId,
    open_instrument_id: run.instrumentId,
  })
  await trx('run_details').insert({ run_seq: seq, setup: JSON.stringify(run.setup) })
  return Number(seq)
}

export async function updateOpener(trx: Knex, seq: number, userId: string): Promise<void> {
  await trx('runs').where({ seq, status: 'open' }).update({ opened_by: userId })
}

export async function insertAction(knex: Knex, seq: number, action: RunAction): Promise<void> {
  await knex('run_actions').insert({
    id: action.id,
    run_seq: seq,
    no: action.no,
    frame: action.frame,
    user_id: action.userId,
    person: action.person,
    at: new Date(action.at),
    action: JSON.stringify(action.action),
  })
}

export async function findActions(knex: Knex, seq: number): Promise<RunAction[]> {
  const rows = (await knex('run_actions').where({ run_seq: seq }).orderBy('no')) as {
    id: string
    no: number
    frame: number
    user_id: string
    person: string
    at: Date
    action: unknown
  }[]
  return rows.map((row) => ({
    id: row.id,
    no: row.no,
    frame: row.frame,
    userId: row.user_id,
    person: row.person,
    at: row.at.toISOString(),
    action: RunActionBody.parse(fromJson(row.action)),
  }))
}

/** Removes actions of this run that are not in the list: their person was told that they were not stored. */
export async function deleteOtherActions(knex: Knex, seq: number, keep: readonly string[]): Promise<number> {
  return knex('run_actions')
    .where({ run_seq: seq })
    .whereNotIn('id', keep.length ? [...keep] : [''])
    .delete()
}

/** Storing the same segment again changes nothing; another one in its place is an error. */
export async function insertSegment(
  knex: Knex,
  seq: number,
  segment: StoredSegment,
  at: Date,
): Promise<void> {
  try {
    await knex('trace_segments').insert({
      run_seq: seq,
      no: segment.no,
      from_frame: segment.fromFrame,
      frames: segment.frames,
      sha256: segment.sha256,
      data: segment.data,
      committed_at: at,
    })
  } catch (error) {
    if (!isDuplicate(error)) throw error
    const stored = await knex('trace_segments')
      .where({ run_seq: seq, no: segment.no })
      .first<{ sha256: Buffer } | undefined>('sha256')
    if (!stored?.sha256.equals(segment.sha256))
      throw new Error(`segment ${segment.no} is stored with other bytes`, { cause: error })
  }
}

export async function findSegments(knex: Knex, seq: number): Promise<StoredSegment[]> {
  const rows = (await knex('trace_segments').where({ run_seq: seq }).orderBy('no')) as {
    no: number
    from_frame: number
    frames: number
    sha256: Buffer
    data: Buffer
  }[]
  return rows.map((row) => ({
    no: row.no,
    fromFrame: row.from_frame,
    frames: row.frames,
    sha256: row.sha256,
    data: row.data,
  }))
}

export interface RunEnd {
  status: 'sealed' | 'stopped' | 'interrupted'
  verdict: Verdict
  endedAt: Date
  endReason: string | null
  /** what computed the readings that are stored */
  runtime: string
  measured: MeasuredRun
}

/** Ends an open run; false when it was not open any more. */
export async function endRun(trx: Knex, seq: number, end: RunEnd): Promise<boolean> {
  const changed = await trx('runs').where({ seq, status: 'open' }).update({
    status: end.status,
    verdict: end.verdict,
    ended_at: end.endedAt,
    end_reason: end.endReason,
    runtime: end.runtime,
    open_bench_id: null,
    open_instrument_id: null,
  })
  if (changed === 0) return false
  await trx('run_details')
    .where({ run_seq: seq })
    .update({ measured: JSON.stringify(end.measured) })
  await trx('run_readings').insert({ run_seq: seq, ...readingsOf(end.measured) })
  return true
}

/** The narrow row that a million runs are scanned by. */
function readingsOf(measured: MeasuredRun): Record<string, number | null> {
  const row: Record<string, number | null> = {
    range: measured.range.value,
    range_u: measured.range.u,
    step: measured.step.value,
    step_u: measured.step.u,
    mean_level: measured.meanLevel.value,
    mean_level_u: measured.meanLevel.u,
    noise_flat: measured.noise.flat.value,
    noise_a: measured.noise.a.value,
    hum: measured.noise.hum.value,
    sn_flat: measured.snFlat.value,
    sn_a: measured.snA.value,
    disturbance_count: measured.jack.disturbanceCount,
    disturbance_longest: measured.jack.disturbanceLongestMs,
    contact_tip: measured.jack.contactTipOhm,
    contact_ring: measured.jack.contactRingOhm,
    contact_sleeve: measured.jack.contactSleeveOhm,
    insulation: measured.jack.insulationMohm,
    current_plugged: measured.supply.pluggedMa,
    current_unplugged: measured.supply.unpluggedUa,
    battery: measured.supply.batteryV,
  }
  for (const stringNo of STRING_NOS) {
    const result = measured.strings[stringNo - 1]!
    row[`level_${stringNo}`] = result.level.value
    row[`level_${stringNo}_u`] = result.level.u
    row[`balance_${stringNo}`] = result.balance.value
    row[`balance_${stringNo}_u`] = result.balance.u
    row[`separation_${stringNo}`] = result.separation.value
    row[`s_${stringNo}`] = result.sDb
  }
  return row
}

/** The standing of an instrument; practice does not touch it. */
export async function updateStanding(
  trx: Knex,
  instrumentId: string,
  run: { id: string; openedAt: Date; verdict: Verdict },
): Promise<void> {
  await trx('instruments')
    .where({ id: instrumentId })
    .update({
      last_run_id: run.id,
      last_run_at: run.openedAt,
      last_verdict: run.verdict,
      runs: trx.raw('runs + 1'),
    })
}

export async function insertOutbox(trx: Knex, kind: string, payload: object, at: Date): Promise<void> {
  await trx('outbox').insert({ kind, payload: JSON.stringify(payload), created_at: at })
}

export async function listRuns(
  knex: Knex,
  filter: { instrumentId?: string; from?: string; to?: string; beforeSeq?: number; limit: number },
): Promise<{ seq: number; summary: RunSummary }[]> {
  const query = runs(knex)
    .join('models', 'models.id', 'runs.model_id')
    .orderBy('runs.seq', 'desc')
    .limit(filter.limit)
    .select(RUN_COLUMNS)
  if (filter.instrumentId) void query.where('runs.instrument_id', filter.instrumentId)
  if (filter.from) void query.where('runs.opened_at', '>=', new Date(filter.from))
  if (filter.to) void query.where('runs.opened_at', '<', new Date(filter.to))
  if (filter.beforeSeq) void query.where('runs.seq', '<', filter.beforeSeq)
  const rows = (await query) as RawRun[]
  return rows.map((raw) => ({ seq: Number(raw.seq), summary: toSummary(toRun(raw)) }))
}

export async function runSummariesOfInstrument(knex: Knex, instrumentId: string): Promise<RunSummary[]> {
  const rows = await listRuns(knex, { instrumentId, limit: 100 })
  return rows.map((row) => row.summary)
}

function toSummary(run: RunRow): RunSummary {
  const balance = run.setup.sheet.rules.find((rule) => rule.rule === 'balance')
  return {
    id: run.id,
    serial: run.serial,
    modelName: run.setup.model.name,
    benchName: run.benchName,
    person: run.openedBy.name,
    reason: run.reason,
    status: run.status,
    verdict: run.verdict,
    openedAt: run.openedAt.toISOString(),
    endedAt: run.endedAt?.toISOString() ?? null,
    sheetLabel: run.setup.sheet.label,
    handedness: run.setup.model.handedness,
    balancesDb: STRING_NOS.map((stringNo) => run.measured?.strings[stringNo - 1]?.balance.value ?? null),
    balanceLowDb: balance?.low ?? null,
    balanceHighDb: balance?.high ?? null,
    failing: [
      ...new Set(
        (run.measured?.results ?? [])
          .filter((result) => result.result === 'outside' && result.onOutside === 'reject')
          .map((result) => result.rule),
      ),
    ],
  }
}

/** Ids of runs that have ended, oldest first. */
export async function endedRunIds(knex: Knex, serial: string | null): Promise<string[]> {
  const query = knex('runs').whereNot('runs.status', 'open').orderBy('runs.seq').select('runs.id')
  if (serial)
    void query.join('instruments', 'instruments.id', 'runs.instrument_id').where('instruments.serial', serial)
  const rows = (await query) as { id: string }[]
  return rows.map((row) => row.id)
}

import type { Knex } from 'knex'
import { Verdict } from '../../src/shared/contract/measured.ts'
import type { Model } from '../../src/shared/contract/thresholds.ts'
import type { InstrumentSummary } from '../../src/shared/contract/workshop.ts'
import { modelOf } from '../models/models.queries.ts'
import type { RawModel } from '../models/models.queries.ts'
import { foldedSerial } from './foldedSerial.ts'

interface RawInstrument {
  id: string
  serial: string
  model_id: string
  model_name: string
  created_at: Date
  runs: number
  last_run_at: Date | null
  last_verdict: string | null
}

const COLUMNS = [
  'instruments.id',
  'instruments.serial',
  'instruments.model_id',
  'models.name as model_name',
  'instruments.created_at',
  'instruments.runs',
  'instruments.last_run_at',
  'instruments.last_verdict',
]

function summaryOf(row: RawInstrument): InstrumentSummary {
  return {
    id: row.id,
    serial: row.serial,
    modelId: row.model_id,
    modelName: row.model_name,
    createdAt: row.created_at.toISOString(),
    runs: row.runs,
    lastRunAt: row.last_run_at?.toISOString() ?? null,
    lastVerdict: row.last_verdict === null ? null : Verdict.parse(row.last_verdict),
  }
}

const instruments = (knex: Knex): Knex.QueryBuilder =>
  knex('instruments').join('models', 'models.id', 'instruments.model_id')

/** Place of a row in the list; the id decides between those made in the same millisecond. */
export interface InstrumentPlace {
  createdAt: Date
  id: string
}

/** Newest first, those after the place; see `matching` for the search. */
export async function listInstruments(
  knex: Knex,
  filter: { search: string; after: InstrumentPlace | null; limit: number },
): Promise<InstrumentSummary[]> {
  const query = instruments(knex)
    .orderBy('instruments.created_at', 'desc')
    .orderBy('instruments.id', 'desc')
    .limit(filter.limit)
    .select(COLUMNS)
  if (filter.search) void matching(query, filter.search)
  const { after } = filter
  if (after) {
    void query
      // Follows from the next line; alone the database can use it to begin in the middle of the index.
      .where('instruments.created_at', '<=', after.createdAt)
      .whereRaw('(instruments.created_at < ? or instruments.id < ?)', [after.createdAt, after.id])
  }
  return ((await query) as RawInstrument[]).map(summaryOf)
}

/** A part of a serial, whichever way O, 0, I and 1 were read, or a part of the model's name. */
function matching(query: Knex.QueryBuilder, search: string): Knex.QueryBuilder {
  // Folding leaves letters and digits only, so that pattern needs no escaping; nothing left is in no serial.
  const serial = foldedSerial(search)
  const name = search.replace(/[\\%_]/g, '\\$&')
  return query.whereRaw('(models.name like ? or instruments.serial_folded like ?)', [
    `%${name}%`,
    serial ? `%${serial}%` : '',
  ])
}

export async function findInstrument(
  knex: Knex,
  serial: string,
): Promise<{ instrument: InstrumentSummary; model: Model } | null> {
  const row = await instruments(knex)
    .where('instruments.serial', serial)
    .first<RawInstrument | undefined>(COLUMNS)
  if (!row) return null
  const model = await knex('models').where({ id: row.model_id }).first<RawModel>('*')
  return { instrument: summaryOf(row), model: modelOf(model) }
}

/** At most two that a scanned code can mean, the exact one alone when there is one. */
export async function findInstrumentsByCode(
  knex: Knex,
  code: string,
): Promise<{ serial: string; modelName: string }[]> {
  const rows = await instruments(knex)
    .where('instruments.serial_folded', foldedSerial(code))
    .limit(2)
    .orderByRaw('instruments.serial = ? desc', [code])
    .select<{ serial: string; modelName: string }[]>('instruments.serial', 'models.name as modelName')
  return rows[0]?.serial === code ? rows.slice(0, 1) : rows
}

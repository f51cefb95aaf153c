import type { Knex } from 'knex'
import { Model, RevisionStatus, ThresholdSheet } from '../../src/shared/contract/thresholds.ts'
import type { SheetSummary } from '../../src/shared/contract/thresholds.ts'
import type { ModelView } from '../../src/shared/contract/workshop.ts'
import { fromJson } from '../runs/runs.queries.ts'

export interface RawModel {
  id: string
  key: string
  name: string
  strings: string
  handedness: string
  circuit: string
  jack_kind: string
  tuning: unknown
  is_recording: number
}

export function modelOf(raw: RawModel): Model {
  return Model.parse({
    id: raw.id,
    key: raw.key,
    name: raw.name,
    strings: raw.strings,
    handedness: raw.handedness,
    circuit: raw.circuit,
    jackKind: raw.jack_kind,
    tuning: fromJson(raw.tuning),
    isRecording: Boolean(raw.is_recording),
  })
}

interface RawRevision {
  model_id: string
  id: string
  label: string
  revision: number
  status: string
  in_force_from: Date
}

/** All models by name, each with the revision that is in force at `now`. */
export async function listModels(knex: Knex, now: Date): Promise<ModelView[]> {
  const models = await knex('models').orderBy('name').select<RawModel[]>('*')
  const revisions = await knex('threshold_revisions')
    .where('status', 'inForce')
    .where('in_force_from', '<=', now)
    .orderBy('in_force_from')
    .orderBy('revision')
    .select<RawRevision[]>('model_id', 'id', 'label', 'revision', 'status', 'in_force_from')
  // The last of a model in this order is the one in force.
  const inForce = new Map(revisions.map((row) => [row.model_id, row]))
  const sheets = await findSheets(
    knex,
    [...inForce.values()].map(({ id }) => id),
  )
  return models.map((row) => {
    const revision = inForce.get(row.id)
    return {
      ...modelOf(row),
      sheetInForce: revision ? summaryOf(revision) : null,
      sheet: (revision && sheets.get(revision.id)) ?? null,
    }
  })
}

async function findSheets(knex: Knex, ids: string[]): Promise<Map<string, ThresholdSheet>> {
  const rows = await knex('threshold_revisions')
    .whereIn('id', ids)
    .select<{ id: string; sheet: unknown }[]>('id', 'sheet')
  return new Map(rows.map(({ id, sheet }) => [id, ThresholdSheet.parse(fromJson(sheet))]))
}

function summaryOf(row: RawRevision): SheetSummary {
  return {
    id: row.id,
    label: row.label,
    revision: row.revision,
    status: RevisionStatus.parse(row.status),
    inForceFrom: row.in_force_from.toISOString(),
  }
}

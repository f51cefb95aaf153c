import { randomUUID } from 'node:crypto'
import type { Knex } from 'knex'
import { z } from 'zod'
import { ThresholdSheet } from '../../src/shared/contract/thresholds.ts'
import { findVerification } from '../bench/bench.queries.ts'
import type { VerifiedSetup } from '../bench/benchSetup.ts'
import { isDuplicate } from '../connect.ts'
import { AppError } from '../errors.ts'
import type { Model } from '../../src/shared/contract/thresholds.ts'
import { modelOf } from '../models/models.queries.ts'
import type { RawModel } from '../models/models.queries.ts'
import { foldedSerial } from '../instruments/foldedSerial.ts'
import { fromJson } from './runs.queries.ts'

const Numbers = z.array(z.number())

export interface BenchSetup {
  name: string
  calibrationDb: number[]
  uCalOwnDb: number
  uCalSharedDb: number
  studySDb: number | null
  /** of the newest verification when it passed, still holds and was of the same set-up, else null */
  verificationId: string | null
  /** one for each channel when verified, else empty */
  floorDb: number[]
}

/** `hello`: what the bench says of itself today, null when it is not connected. */
export async function findBenchSetup(
  knex: Knex,
  benchId: string,
  at: Date,
  hello: VerifiedSetup | null,
): Promise<BenchSetup | null> {
  const bench = (await knex('benches').where({ id: benchId, retired_at: null }).first()) as
    | {
        name: string
        calibration_db: unknown
        u_cal_own_db: number
        u_cal_shared_db: number
        study_s_db: number | null
      }
    | undefined
  if (!bench) return null
  const verification = hello && (await findVerification(knex, benchId, at, hello))
  return {
    name: bench.name,
    calibrationDb: Numbers.parse(fromJson(bench.calibration_db)),
    uCalOwnDb: bench.u_cal_own_db,
    uCalSharedDb: bench.u_cal_shared_db,
    studySDb: bench.study_s_db,
    verificationId: verification?.id ?? null,
    floorDb: verification?.floorDb ?? [],
  }
}

/** The model of a known serial, or for a new one the model that was chosen. */
export async function findStartModel(knex: Knex, serial: string, modelId: string | null): Promise<Model> {
  const known = await knex('instruments')
    .join('models', 'models.id', 'instruments.model_id')
    .where('instruments.serial', serial)
    .first<RawModel | undefined>('models.*')
  if (known) {
    if (modelId && modelId !== known.id)
      throw new AppError('instrument.model-differs', { facts: { model: known.name } })
    return modelOf(known)
  }
  if (!modelId) throw new AppError('instrument.unknown', { facts: { serial } })
  const chosen = await knex('models').where({ id: modelId }).first<RawModel | undefined>()
  if (!chosen) throw new AppError('model.unknown')
  return modelOf(chosen)
}

/** The revision in force at that moment; it judges the run, whatever is approved meanwhile. */
export async function findSheetInForce(
  knex: Knex,
  modelId: string,
  at: Date,
): Promise<ThresholdSheet | null> {
  const row = await knex('threshold_revisions')
    .where({ model_id: modelId, status: 'inForce' })
    .where('in_force_from', '<=', at)
    .orderBy('in_force_from', 'desc')
    .orderBy('revision', 'desc')
    .first<{ sheet: unknown } | undefined>('sheet')
  return row ? ThresholdSheet.parse(fromJson(row.sheet)) : null
}

/** Two at once for one new serial: the second one waits for the first and then finds its record. */
export async function findOrInsertInstrument(
  trx: Knex,
  serial: string,
  modelId: string,
  at: Date,
): Promise<string> {
  const known = await trx('instruments').where({ serial }).first<{ id: string } | undefined>('id')
  if (known) return known.id
  const id = randomUUID()
  try {
    await trx('instruments').insert({
      id,
      serial,
      serial_folded: foldedSerial(serial),
      model_id: modelId,
      created_at: at,
    })
    return id
  } catch (error) {
    if (!isDuplicate(error)) throw error
    // A plain read would still show the moment at which this transaction began.
    const row = await trx('instruments').where({ serial }).forShare().first<{ id: string }>('id')
    return row.id
  }
}

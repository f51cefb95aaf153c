import type { Knex } from 'knex'
import { z } from 'zod'
import type { BenchHello, BenchVerify } from '../../src/shared/contract/frames.ts'
import { fromJson } from '../runs/runs.queries.ts'

export async function findBenchByToken(knex: Knex, tokenHash: Buffer): Promise<string | null> {
  const row = await knex('benches')
    .where({ token_hash: tokenHash, retired_at: null })
    .first<{ id: string } | undefined>('id')
  return row?.id ?? null
}

/** What the bench said of itself at its newest hello. */
export async function touchBench(
  knex: Knex,
  benchId: string,
  hello: BenchHello,
  at: Date,
): Promise<{ name: string; simulated: boolean }> {
  await knex('benches')
    .where({ id: benchId })
    .update({
      channel_kind: hello.channelKind,
      mains_hz: hello.mainsHz,
      capabilities: JSON.stringify(hello.capabilities),
      last_connected_at: at,
    })
  const row = await knex('benches').where({ id: benchId }).first<{
    name: string
    simulated: number
  }>('name', 'simulated')
  return { name: row.name, simulated: Boolean(row.simulated) }
}

/** dB to add to each channel's level. */
export async function findCalibration(knex: Knex, benchId: string): Promise<number[]> {
  const row = await knex('benches')
    .where({ id: benchId })
    .first<{ calibration_db: unknown }>('calibration_db')
  return z.array(z.number()).parse(fromJson(row.calibration_db))
}

/** The newest verification, when it passed and still holds. */
export async function findVerification(
  knex: Knex,
  benchId: string,
  at: Date,
): Promise<{ id: string; validUntil: Date } | null> {
  const newest = await knex('bench_verifications')
    .where({ bench_id: benchId })
    .orderBy('at', 'desc')
    .first<{ id: string; passed: number; valid_until: Date | null } | undefined>()
  if (!newest?.passed || !newest.valid_until || newest.valid_until <= at) return null
  return { id: newest.id, validUntil: newest.valid_until }
}

export async function findVerificationById(
  knex: Knex,
  id: string,
): Promise<{ passed: boolean; validUntil: Date | null; reasons: unknown } | null> {
  const row = await knex('bench_verifications')
    .where({ id })
    .first<{ passed: number; valid_until: Date | null; reasons: unknown } | undefined>()
  return row ? { passed: Boolean(row.passed), validUntil: row.valid_until, reasons: row.reasons } : null
}

export interface NewVerification {
  id: string
  benchId: string
  at: Date
  byName: string
  measured: BenchVerify
  passed: boolean
  reasons: string[]
  floorDb: number[]
  validUntil: Date | null
}

export async function insertVerification(trx: Knex, verification: NewVerification): Promise<void> {
  await trx('bench_verifications').insert({
    id: verification.id,
    bench_id: verification.benchId,
    at: verification.at,
    by_name: verification.byName,
    check_standard: verification.measured.checkStandard,
    measurements: JSON.stringify(verification.measured),
    passed: verification.passed,
    reasons: JSON.stringify(verification.reasons),
    floor_db: JSON.stringify(verification.floorDb),
    valid_until: verification.validUntil,
  })
}

import type { Knex } from 'knex'
import { z } from 'zod'
import { Algorithms, ChannelKind } from '../../src/shared/contract/frames.ts'
import type { BenchHello, BenchVerify, RunEnded } from '../../src/shared/contract/frames.ts'
import { Capability } from '../../src/shared/contract/rules.ts'
import { fromJson } from '../runs/runs.queries.ts'
import { channelsOfKind, isCovered } from './benchSetup.ts'
import type { VerifiedSetup } from './benchSetup.ts'

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

export interface Verification {
  id: string
  validUntil: Date
  /** one for each channel */
  floorDb: number[]
}

/** The newest verification, when it passed, still holds and was of what the bench says of itself today. */
export async function findVerification(
  knex: Knex,
  benchId: string,
  at: Date,
  hello: VerifiedSetup,
): Promise<Verification | null> {
  const newest = await knex('bench_verifications')
    .where({ bench_id: benchId })
    .orderBy([
      { column: 'at', order: 'desc' },
      { column: 'id', order: 'desc' },
    ])
    .first<RawVerification | undefined>()
  if (!newest?.passed || !newest.valid_until || newest.valid_until <= at) return null
  const verified = verifiedSetupOf(newest)
  if (!verified || !isCovered(verified, hello)) return null
  const floorDb = z.array(z.number()).parse(fromJson(newest.floor_db))
  if (floorDb.length !== channelsOfKind(hello.channelKind)) return null
  return { id: newest.id, validUntil: newest.valid_until, floorDb }
}

export interface RawVerifiedSetup {
  channel_kind: string | null
  capabilities: unknown
  algorithms: unknown
}

interface RawVerification extends RawVerifiedSetup {
  id: string
  passed: number
  valid_until: Date | null
  floor_db: unknown
}

/** null: the record does not tell what was verified. */
export function verifiedSetupOf(raw: RawVerifiedSetup): VerifiedSetup | null {
  if (raw.channel_kind === null) return null
  return {
    channelKind: ChannelKind.parse(raw.channel_kind),
    capabilities: z.array(Capability).parse(fromJson(raw.capabilities)),
    algorithms: Algorithms.parse(fromJson(raw.algorithms)),
  }
}

export async function findVerificationById(
  knex: Knex,
  id: string,
): Promise<{ benchId: string; passed: boolean; validUntil: Date | null; reasons: string[] } | null> {
  const row = await knex('bench_verifications')
    .where({ id })
    .first<{ bench_id: string; passed: number; valid_until: Date | null; reasons: unknown } | undefined>()
  if (!row) return null
  return {
    benchId: row.bench_id,
    passed: Boolean(row.passed),
    validUntil: row.valid_until,
    reasons: z.array(z.string()).parse(fromJson(row.reasons)),
  }
}

/** How a run of this bench ended; 'open' while it has not, null when there is no such run. */
export async function findOutcome(
  knex: Knex,
  benchId: string,
  runId: string,
): Promise<'open' | { outcome: RunEnded['outcome']; verdict: RunEnded['verdict'] } | null> {
  const row = await knex('runs')
    .where({ id: runId, bench_id: benchId })
    .first<{ status: 'open' | RunEnded['outcome']; verdict: RunEnded['verdict'] } | undefined>(
      'status',
      'verdict',
    )
  if (!row) return null
  return row.status === 'open' ? 'open' : { outcome: row.status, verdict: row.verdict }
}

export interface NewVerification {
  id: string
  benchId: string
  at: Date
  byName: string
  /** what was verified */
  setup: VerifiedSetup
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
    channel_kind: verification.setup.channelKind,
    capabilities: JSON.stringify(verification.setup.capabilities),
    algorithms: JSON.stringify(verification.setup.algorithms),
    check_standard: verification.measured.checkStandard,
    measurements: JSON.stringify(verification.measured),
    passed: verification.passed,
    reasons: JSON.stringify(verification.reasons),
    floor_db: JSON.stringify(verification.floorDb),
    valid_until: verification.validUntil,
  })
}

import type { Knex } from 'knex'
import { z } from 'zod'
import { ChannelKind } from '../../src/shared/contract/frames.ts'
import type { BenchHello } from '../../src/shared/contract/frames.ts'
import { Capability } from '../../src/shared/contract/rules.ts'
import type { BenchView } from '../../src/shared/contract/workshop.ts'
import { verifiedSetupOf } from '../bench/bench.queries.ts'
import { isCovered } from '../bench/benchSetup.ts'
import { fromJson } from '../runs/runs.queries.ts'
import type { BenchConnections } from './benchConnections.ts'

interface RawBench {
  id: string
  name: string
  code: string
  enrolled: number
  simulated: number
  channel_kind: string | null
  capabilities: unknown
  verified_at: Date | null
  passed: number | null
  valid_until: Date | null
  verified_kind: string | null
  verified_capabilities: unknown
  verified_algorithms: unknown
  run_id: string | null
  run_serial: string | null
  run_person: string | null
}

const NEWEST_VERIFICATION = `bench_verifications.id = (
  select newest.id from bench_verifications as newest
  where newest.bench_id = benches.id order by newest.at desc, newest.id desc limit 1)`

function benches(knex: Knex): Knex.QueryBuilder {
  return knex('benches')
    .leftJoin('bench_verifications', (on) => on.on(knex.raw(NEWEST_VERIFICATION)))
    .leftJoin('runs', 'runs.open_bench_id', 'benches.id')
    .leftJoin('instruments', 'instruments.id', 'runs.instrument_id')
    .leftJoin('users', 'users.id', 'runs.opened_by')
    .whereNull('benches.retired_at')
    .orderBy('benches.name')
    .select(
      'benches.id',
      'benches.name',
      'benches.code',
      knex.raw('benches.token_hash is not null as enrolled'),
      'benches.simulated',
      'benches.channel_kind',
      'benches.capabilities',
      'bench_verifications.at as verified_at',
      'bench_verifications.passed',
      'bench_verifications.valid_until',
      'bench_verifications.channel_kind as verified_kind',
      'bench_verifications.capabilities as verified_capabilities',
      'bench_verifications.algorithms as verified_algorithms',
      'runs.id as run_id',
      'instruments.serial as run_serial',
      'users.name as run_person',
    )
}

function benchOf(row: RawBench, hub: BenchConnections, now: Date): BenchView {
  return {
    id: row.id,
    name: row.name,
    code: row.code,
    enrolled: Boolean(row.enrolled),
    simulated: Boolean(row.simulated),
    channelKind: row.channel_kind === null ? null : ChannelKind.parse(row.channel_kind),
    capabilities: z.array(Capability).parse(fromJson(row.capabilities)),
    connected: hub.isConnected(row.id),
    verifiedAt: row.verified_at?.toISOString() ?? null,
    verifiedUntil: row.valid_until?.toISOString() ?? null,
    verified: isVerified(row, hub.helloOf(row.id), now),
    openRun:
      row.run_id === null ? null : { id: row.run_id, serial: row.run_serial!, person: row.run_person! },
  }
}

/** While a bench is away its set-up is not known: then only time counts. */
function isVerified(row: RawBench, hello: BenchHello | null, now: Date): boolean {
  if (!row.passed || row.valid_until === null || row.valid_until <= now) return false
  const verified = verifiedSetupOf({
    channel_kind: row.verified_kind,
    capabilities: row.verified_capabilities,
    algorithms: row.verified_algorithms,
  })
  return verified !== null && (hello === null || isCovered(verified, hello))
}

/** Benches that are not retired, by name. */
export async function listBenches(knex: Knex, hub: BenchConnections, now: Date): Promise<BenchView[]> {
  return ((await benches(knex)) as RawBench[]).map((row) => benchOf(row, hub, now))
}

export async function findBench(
  knex: Knex,
  hub: BenchConnections,
  id: string,
  now: Date,
): Promise<BenchView | null> {
  const [row] = (await benches(knex).where('benches.id', id)) as RawBench[]
  return row ? benchOf(row, hub, now) : null
}

/** Who opened the run that is open on this bench. */
export async function findOpener(knex: Knex, benchId: string): Promise<{ id: string; name: string } | null> {
  const row = await knex('runs')
    .join('users', 'users.id', 'runs.opened_by')
    .where('runs.open_bench_id', benchId)
    .first<{ id: string; name: string } | undefined>('users.id', 'users.name')
  return row ?? null
}

export async function findBenchByCode(
  knex: Knex,
  code: string,
): Promise<{ id: string; name: string } | null> {
  const row = await knex('benches')
    .where({ code, retired_at: null })
    .first<{ id: string; name: string } | undefined>('id', 'name')
  return row ?? null
}

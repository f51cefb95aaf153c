import { randomBytes, randomUUID } from 'node:crypto'
import type { Knex } from 'knex'
import type { Verdict } from '../../src/shared/contract/measured.ts'
import type { ThresholdSheet } from '../../src/shared/contract/thresholds.ts'
import { foldedSerial } from '../../server/instruments/foldedSerial.ts'

/** Records as plain as they can be, for tests of lists and look-ups. */
export async function addModel(
  knex: Knex,
  name = 'Model',
  overrides: { key?: string } = {},
): Promise<string> {
  const id = randomUUID()
  const tuning = [1, 2, 3, 4, 5, 6].map((stringNo) => ({ stringNo, name: 'E', pitchesHz: [100 * stringNo] }))
  await knex('models').insert({
    id,
    key: overrides.key ?? randomBytes(5).toString('hex').toUpperCase(),
    name,
    strings: 'six',
    handedness: 'right',
    circuit: 'parallel',
    jack_kind: 'switchedThreePole',
    tuning: JSON.stringify(tuning),
    is_recording: false,
  })
  return id
}

function plainSheet(id: string, modelId: string, revision: number): ThresholdSheet {
  return {
    id,
    modelId,
    label: `S-${id.slice(0, 8)}`,
    revision,
    plucks: { n: 3, nMax: 6, largestSDb: 1.5 },
    guard: { on: false, balanceU: 0, levelU: 0 },
    noiseStretchMs: 2000,
    wiggleMs: 5000,
    patternDb: null,
    patternUDb: 0,
    patternInstruments: 0,
    referenceLevelDb: -20,
    rules: [{ rule: 'speaks', low: null, high: null, onOutside: 'reject', required: true }],
  }
}

export async function addRevision(
  knex: Knex,
  modelId: string,
  revision: { no: number; status: string; inForceFrom: Date | null },
): Promise<string> {
  const id = randomUUID()
  await knex('threshold_revisions').insert({
    id,
    model_id: modelId,
    revision: revision.no,
    label: `S-${id.slice(0, 8)}`,
    status: revision.status,
    in_force_from: revision.inForceFrom,
    sheet: JSON.stringify(plainSheet(id, modelId, revision.no)),
    created_at: new Date('2026-01-01T00:00:00Z'),
  })
  return id
}

export async function addInstrument(
  knex: Knex,
  modelId: string,
  serial: string,
  createdAt: Date,
  standing: { runs: number; lastRunAt: Date | null; lastVerdict: Verdict | null } = {
    runs: 0,
    lastRunAt: null,
    lastVerdict: null,
  },
): Promise<string> {
  const id = randomUUID()
  await knex('instruments').insert({
    id,
    serial,
    serial_folded: foldedSerial(serial),
    model_id: modelId,
    created_at: createdAt,
    runs: standing.runs,
    last_run_at: standing.lastRunAt,
    last_verdict: standing.lastVerdict,
  })
  return id
}

export async function addBench(
  knex: Knex,
  bench: { name: string; code: string; simulated?: boolean; enrolled?: boolean; retiredAt?: Date },
): Promise<string> {
  const id = randomUUID()
  await knex('benches').insert({
    id,
    name: bench.name,
    code: bench.code,
    token_hash: bench.enrolled === false ? null : randomBytes(32),
    simulated: bench.simulated ?? true,
    channel_kind: 'six',
    mains_hz: 50,
    capabilities: JSON.stringify(['sixLevels', 'pitch']),
    calibration_db: JSON.stringify([0, 0, 0, 0, 0, 0]),
    u_cal_own_db: 0.1,
    u_cal_shared_db: 0.1,
    created_at: new Date('2026-01-01T00:00:00Z'),
    retired_at: bench.retiredAt ?? null,
  })
  return id
}

export async function addVerification(
  knex: Knex,
  benchId: string,
  verification: { at: Date; passed: boolean; validUntil: Date | null },
): Promise<void> {
  await knex('bench_verifications').insert({
    id: randomUUID(),
    bench_id: benchId,
    at: verification.at,
    by_name: 'check',
    channel_kind: 'six',
    capabilities: JSON.stringify(['sixLevels', 'pitch']),
    algorithms: JSON.stringify({ levels: '1' }),
    check_standard: 'CS-1',
    measurements: JSON.stringify({}),
    passed: verification.passed,
    reasons: JSON.stringify([]),
    floor_db: JSON.stringify([]),
    valid_until: verification.validUntil,
  })
}

/** An open run, as far as lists need it. */
export async function addOpenRun(
  knex: Knex,
  run: { instrumentId: string; modelId: string; benchId: string; userId: string; sheetId: string },
): Promise<string> {
  const id = randomUUID()
  await knex('runs').insert({
    id,
    instrument_id: run.instrumentId,
    model_id: run.modelId,
    bench_id: run.benchId,
    opened_by: run.userId,
    sheet_id: run.sheetId,
    method: 1,
    reason: 'new',
    status: 'open',
    opened_at: new Date('2026-03-04T08:00:00Z'),
    runtime: 'test',
    open_bench_id: run.benchId,
    open_instrument_id: run.instrumentId,
  })
  return id
}

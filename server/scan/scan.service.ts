import type { Knex } from 'knex'
import { Id } from '../../src/shared/contract/quantities.ts'
import { Serial } from '../../src/shared/contract/runs.ts'
import type { ScanTarget } from '../../src/shared/contract/workshop.ts'
import { findBenchByCode } from '../benches/benches.queries.ts'
import { AppError } from '../errors.ts'
import { findInstrumentsByCode } from '../instruments/instruments.queries.ts'
import { isRun } from './scan.queries.ts'

/** What is scanned may be an address of ours; then its last part counts. */
function codeOf(scanned: string): string {
  const trimmed = scanned.trim()
  const isAddress = /^https?:\/\//i.test(trimmed) && URL.canParse(trimmed)
  return isAddress ? (new URL(trimmed).pathname.split('/').filter(Boolean).at(-1) ?? '') : trimmed
}

/**
 * What a scanned or typed code belongs to. A serial is found exactly, else whichever way O, 0, I and 1 were read, but
 * only when that leaves one: a guess between two instruments would put a run on the wrong one.
 */
export async function resolveScan(knex: Knex, scanned: string): Promise<ScanTarget> {
  const code = codeOf(scanned)
  const runId = code.toLowerCase()
  if (Id.safeParse(runId).success && (await isRun(knex, runId))) return { kind: 'run', runId }
  const capitals = code.toUpperCase()
  const bench = await findBenchByCode(knex, capitals)
  if (bench) return { kind: 'bench', benchId: bench.id, name: bench.name }
  const serial = Serial.safeParse(capitals)
  if (!serial.success) throw new AppError('serial.invalid')
  const found = await findInstrumentsByCode(knex, serial.data)
  if (found.length === 1) return { kind: 'instrument', ...found[0]! }
  return { kind: 'unknownSerial', serial: serial.data }
}

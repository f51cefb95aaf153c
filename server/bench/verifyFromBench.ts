import type { Knex } from 'knex'
import { z } from 'zod'
import type { BenchVerify, ChannelKind } from '../../src/shared/contract/frames.ts'
import type { Capability } from '../../src/shared/contract/rules.ts'
import { verifyBench } from '../../src/shared/measure/verifyBench.ts'
import { insertAudit } from '../audit/audit.queries.ts'
import { fromJson } from '../runs/runs.queries.ts'
import { findVerificationById, insertVerification } from './bench.queries.ts'

/** Common practice: at the start of a shift, a shift change and after a lead was changed. */
const VALID_HOURS = 12

/** What the bench claims decides what has to be checked. */
export interface VerifyingBench {
  id: string
  channelKind: ChannelKind
  capabilities: readonly Capability[]
  calibrationDb: readonly number[]
}

/** Judges the check standard's readings and keeps them as a verification record. The same id again changes nothing. */
export async function verifyFromBench(
  knex: Knex,
  bench: VerifyingBench,
  measured: BenchVerify,
  at: Date,
): Promise<{ passed: boolean; validUntil: string | null; reasons: string[] }> {
  const known = await findVerificationById(knex, measured.id)
  if (known)
    return {
      passed: known.passed,
      validUntil: known.validUntil?.toISOString() ?? null,
      reasons: z.array(z.string()).parse(fromJson(known.reasons)),
    }
  const { passed, reasons, floorDb } = verifyBench(measured, bench)
  const validUntil = passed ? new Date(at.getTime() + VALID_HOURS * 3_600_000) : null
  await knex.transaction(async (trx) => {
    await insertVerification(trx, {
      id: measured.id,
      benchId: bench.id,
      at,
      byName: 'the bench itself',
      measured,
      passed,
      reasons,
      floorDb,
      validUntil,
    })
    await insertAudit(
      trx,
      {
        userId: null,
        actor: 'bench',
        action: 'bench.verified',
        subject: 'bench',
        subjectId: bench.id,
        details: { passed, checkStandard: measured.checkStandard, reasons },
      },
      at,
    )
  })
  return { passed, validUntil: validUntil?.toISOString() ?? null, reasons }
}

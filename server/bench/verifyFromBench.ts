import type { Knex } from 'knex'
import type { BenchVerify } from '../../src/shared/contract/frames.ts'
import { verifyBench } from '../../src/shared/measure/verifyBench.ts'
import { insertAudit } from '../audit/audit.queries.ts'
import { isDuplicate } from '../connect.ts'
import { AppError } from '../errors.ts'
import { findVerificationById, insertVerification } from './bench.queries.ts'
import type { VerifiedSetup } from './benchSetup.ts'

interface VerificationAnswer {
  passed: boolean
  validUntil: string | null
  reasons: string[]
}

/** Common practice: at the start of a shift, a shift change and after a lead was changed. */
const VALID_HOURS = 12

/** What the bench claims decides what has to be checked. */
export interface VerifyingBench extends VerifiedSetup {
  id: string
  calibrationDb: readonly number[]
}

/** Judges the check standard's readings and keeps them as a verification record. The same id again changes nothing. */
export async function verifyFromBench(
  knex: Knex,
  bench: VerifyingBench,
  measured: BenchVerify,
  at: Date,
): Promise<VerificationAnswer> {
  const known = await answerBefore(knex, bench.id, measured.id)
  if (known) return known
  const { passed, reasons, floorDb } = verifyBench(measured, bench)
  const validUntil = passed ? new Date(at.getTime() + VALID_HOURS * 3_600_000) : null
  const { channelKind, capabilities, algorithms } = bench
  try {
    await knex.transaction(async (trx) => {
      await insertVerification(trx, {
        id: measured.id,
        benchId: bench.id,
        at,
        byName: 'the bench itself',
        setup: { channelKind, capabilities, algorithms },
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
  } catch (error) {
    // Sent twice at once: both get what the first one stored.
    const stored = isDuplicate(error) ? await answerBefore(knex, bench.id, measured.id) : null
    if (stored) return stored
    throw error
  }
  return { passed, validUntil: validUntil?.toISOString() ?? null, reasons }
}

async function answerBefore(knex: Knex, benchId: string, id: string): Promise<VerificationAnswer | null> {
  const known = await findVerificationById(knex, id)
  if (!known) return null
  if (known.benchId !== benchId) throw new AppError('record.exists')
  const { passed, validUntil, reasons } = known
  return { passed, validUntil: validUntil?.toISOString() ?? null, reasons }
}

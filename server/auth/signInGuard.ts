import type { Knex } from 'knex'
import { AppError } from '../errors.ts'
import {
  attemptSubjects,
  deleteAttempts,
  deleteOldAttempts,
  ensureAttempts,
  lockAttempts,
  saveAttempts,
  takeBackFailure,
} from './attempts.queries.ts'
import type { AttemptSubject, AttemptSubjects } from './attempts.queries.ts'
import { FORGET_AFTER_MS, countingFailures, waitSeconds } from './signInDelay.ts'

export interface SignInGuard {
  /** Counts the try as failed before its outcome is known, or refuses it with the seconds to wait. */
  begin: (account: string, address: string) => Promise<PendingTry>
}

export interface PendingTry {
  /** Belongs into the transaction that signs in: clears what the account's own failures cost. */
  succeeded: (trx: Knex) => Promise<void>
}

const KNOWN_FOR_MS = 90 * 86_400_000
const TIDY_EVERY_MS = 60 * 60_000
const MOST_TRIES = 5

/**
 * Growing delay by account and by address, kept in the database. Where an account has signed in before, only the
 * failures of that account at that address count: so strangers who guess at a name from elsewhere, or at other names
 * through the same address, cannot keep its owner out.
 */
export function createSignInGuard(knex: Knex, now: () => Date): SignInGuard {
  let tidiedAt = 0

  const tidy = async () => {
    const at = now().getTime()
    if (at - tidiedAt < TIDY_EVERY_MS) return
    tidiedAt = at
    await deleteOldAttempts(knex, {
      failures: new Date(at - FORGET_AFTER_MS),
      known: new Date(at - KNOWN_FOR_MS),
    })
  }

  const count = (subjects: AttemptSubjects) =>
    knex.transaction(async (trx): Promise<AttemptSubject[]> => {
      const at = now()
      const known = await lockAttempts(trx, subjects.known)
      const counted = known ? [subjects.known] : [subjects.account, subjects.address]
      const failures: number[] = []
      for (const subject of counted) {
        if (!known) await ensureAttempts(trx, subject, at)
        const attempts = await lockAttempts(trx, subject)
        const seconds = waitSeconds(subject.kind, attempts, at)
        if (seconds > 0) throw new AppError('sign-in.wait', { facts: { waitSeconds: seconds } })
        failures.push(countingFailures(attempts, at))
      }
      for (const [i, subject] of counted.entries()) await saveAttempts(trx, subject, failures[i]! + 1, at)
      return counted
    })

  return {
    begin: async (account, address) => {
      await tidy()
      const subjects = attemptSubjects(account, address)
      const counted = await retryDeadlock(() => count(subjects))
      return {
        succeeded: async (trx) => {
          await ensureAttempts(trx, subjects.known, now())
          await saveAttempts(trx, subjects.known, 0, now())
          await deleteAttempts(trx, subjects.account)
          if (counted.includes(subjects.address)) await takeBackFailure(trx, subjects.address)
        },
      }
    },
  }
}

/** Two first tries at once may lock in crossing order; the database then undoes one of them, which begins again. */
async function retryDeadlock<T>(work: () => Promise<T>): Promise<T> {
  for (let no = 1; ; no++) {
    try {
      return await work()
    } catch (error) {
      if ((error as { code?: unknown }).code !== 'ER_LOCK_DEADLOCK' || no === MOST_TRIES) throw error
    }
  }
}

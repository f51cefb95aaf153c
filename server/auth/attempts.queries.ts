import { isIPv6 } from 'node:net'
import type { Knex } from 'knex'
import { sha256 } from './randomToken.ts'
import type { AttemptKind, Attempts } from './signInDelay.ts'

/** Who tries: an account, an address, or an account at an address where it has signed in before ('known'). */
export interface AttemptSubject {
  kind: AttemptKind
  hash: Buffer
}

export interface AttemptSubjects {
  account: AttemptSubject
  address: AttemptSubject
  known: AttemptSubject
}

/** Someone with IPv6 has a whole /64 of addresses, so all of it counts as one. */
export function networkOf(address: string): string {
  if (!isIPv6(address) || address.includes('.')) return address
  const [head = '', tail] = address.split('%')[0]!.split('::')
  const before = head.split(':').filter(Boolean)
  const after = tail?.split(':').filter(Boolean) ?? []
  const gap = tail === undefined ? [] : Array<string>(8 - before.length - after.length).fill('0')
  return [...before, ...gap, ...after]
    .slice(0, 4)
    .map((group) => Number.parseInt(group, 16).toString(16))
    .join(':')
}

/** Hashed, because what is typed as a name may be anything, and addresses are personal data. */
export function attemptSubjects(account: string, address: string): AttemptSubjects {
  const network = networkOf(address)
  return {
    account: { kind: 'account', hash: sha256(account) },
    address: { kind: 'address', hash: sha256(network) },
    known: { kind: 'known', hash: sha256(`${account}\n${network}`) },
  }
}

const keyOf = ({ kind, hash }: AttemptSubject) => ({ kind, subject_hash: hash })

async function select(query: Knex.QueryBuilder): Promise<Attempts | null> {
  const row = (await query) as { failures: number; last_failed_at: Date } | undefined
  return row ? { failures: row.failures, lastFailedAt: row.last_failed_at } : null
}

export async function lockAttempts(trx: Knex, subject: AttemptSubject): Promise<Attempts | null> {
  return select(trx('sign_in_attempts').where(keyOf(subject)).forUpdate().first())
}

/** Makes sure that there is a row to lock, so that tries at the same moment queue up behind it. */
export async function ensureAttempts(trx: Knex, subject: AttemptSubject, at: Date): Promise<void> {
  await trx('sign_in_attempts')
    .insert({ ...keyOf(subject), failures: 0, last_failed_at: at })
    .onConflict()
    .merge({ failures: trx.ref('sign_in_attempts.failures') })
}

export async function saveAttempts(
  trx: Knex,
  subject: AttemptSubject,
  failures: number,
  at: Date,
): Promise<void> {
  await trx('sign_in_attempts').where(keyOf(subject)).update({ failures, last_failed_at: at })
}

/** Takes back one failure that was counted before its outcome was known. */
export async function takeBackFailure(trx: Knex, subject: AttemptSubject): Promise<void> {
  await trx('sign_in_attempts').where(keyOf(subject)).where('failures', '>', 0).decrement('failures', 1)
}

export async function deleteAttempts(trx: Knex, subject: AttemptSubject): Promise<void> {
  await trx('sign_in_attempts').where(keyOf(subject)).delete()
}

export async function deleteOldAttempts(knex: Knex, before: { failures: Date; known: Date }): Promise<void> {
  await knex('sign_in_attempts')
    .whereNot('kind', 'known')
    .where('last_failed_at', '<', before.failures)
    .delete()
  await knex('sign_in_attempts').where('kind', 'known').where('last_failed_at', '<', before.known).delete()
}

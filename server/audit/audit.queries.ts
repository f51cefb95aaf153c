import type { Knex } from 'knex'

export interface AuditEntry {
  /** null: no person of the system did it */
  userId: string | null
  /** name at that time */
  actor: string
  /** 'noun.verb' */
  action: string
  subject: string
  subjectId: string
  /** Names of changed fields and plain facts; never contact data, passwords or tokens. */
  details: Record<string, unknown>
}

/** Belongs into the transaction that it tells of: both happen or neither. */
export async function insertAudit(trx: Knex, entry: AuditEntry, at: Date = new Date()): Promise<void> {
  await trx('audit_entries').insert({
    at,
    user_id: entry.userId,
    actor: entry.actor,
    action: entry.action,
    subject: entry.subject,
    subject_id: entry.subjectId,
    details: JSON.stringify(entry.details),
  })
}

import type { Knex } from 'knex'

export async function findAcknowledgedAt(knex: Knex, userId: string, shiftKey: string): Promise<Date | null> {
  const row = await knex('caution_acknowledgements')
    .where({ user_id: userId, shift_key: shiftKey })
    .first<{ at: Date } | undefined>('at')
  return row?.at ?? null
}

/** True when it is the first of this person in this shift; a retry adds nothing. */
export async function insertAcknowledgement(
  trx: Knex,
  row: { id: string; userId: string; shiftKey: string; at: Date },
): Promise<boolean> {
  const before = await findAcknowledgedAt(trx, row.userId, row.shiftKey)
  if (before) return false
  await trx('caution_acknowledgements').insert({
    id: row.id,
    user_id: row.userId,
    shift_key: row.shiftKey,
    at: row.at,
  })
  return true
}

import type { Knex } from 'knex'

export interface InviteRow {
  id: string
  userId: string
  name: string
  email: string
  expiresAt: Date
}

/** The invite of a link that can still be used at `now`, of a person who is active; else null. */
export async function findOpenInvite(knex: Knex, tokenHash: Buffer, now: Date): Promise<InviteRow | null> {
  const row = (await knex('invites')
    .join('users', 'users.id', 'invites.user_id')
    .where('invites.token_hash', tokenHash)
    .whereNull('invites.used_at')
    .where('invites.expires_at', '>', now)
    .whereNull('users.deactivated_at')
    .select('invites.id', 'invites.user_id', 'users.name', 'users.email', 'invites.expires_at')
    .first()) as { id: string; user_id: string; name: string; email: string; expires_at: Date } | undefined
  if (!row) return null
  return { id: row.id, userId: row.user_id, name: row.name, email: row.email, expiresAt: row.expires_at }
}

/** True for the one who used it first. */
export async function useInvite(trx: Knex, id: string, at: Date): Promise<boolean> {
  return (await trx('invites').where({ id }).whereNull('used_at').update({ used_at: at })) === 1
}

export async function insertInvite(
  trx: Knex,
  invite: { id: string; userId: string; tokenHash: Buffer; at: Date; expiresAt: Date },
): Promise<void> {
  await trx('invites').insert({
    id: invite.id,
    user_id: invite.userId,
    token_hash: invite.tokenHash,
    created_at: invite.at,
    expires_at: invite.expiresAt,
  })
}

/** Links that were given out before stop working. */
export async function spendOpenInvites(trx: Knex, userId: string, at: Date): Promise<void> {
  await trx('invites').where({ user_id: userId }).whereNull('used_at').update({ used_at: at })
}

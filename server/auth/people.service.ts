import { randomUUID } from 'node:crypto'
import type { Knex } from 'knex'
import type { Role } from '../../src/shared/contract/permissions.ts'
import { insertAudit } from '../audit/audit.queries.ts'
import { findUserByEmail, insertUser, replaceRoles } from './auth.queries.ts'
import { insertInvite, spendOpenInvites } from './invites.queries.ts'
import { randomToken } from './randomToken.ts'

export interface NewPerson {
  name: string
  email: string
  roles: readonly Role[]
}

export interface Invited {
  userId: string
  token: string
  expiresAt: Date
}

const INVITE_DAYS = 7
const DAY_MS = 86_400_000

/**
 * Makes a person who cannot sign in yet, and the one-time link's token, which is kept nowhere. Someone who was
 * invited but has set no password gets a new link; null: this person has a password already.
 */
export async function invitePerson(
  knex: Knex,
  person: NewPerson,
  actor: { userId: string | null; name: string },
  now: Date,
): Promise<Invited | null> {
  return knex.transaction(async (trx) => {
    const existing = await findUserByEmail(trx, person.email)
    if (existing && (existing.passwordHash !== null || !existing.active)) return null
    const userId = existing?.id ?? randomUUID()
    if (!existing) {
      await insertUser(trx, { id: userId, name: person.name, email: person.email, at: now })
      await replaceRoles(trx, userId, person.roles)
    }
    await spendOpenInvites(trx, userId, now)
    const { token, hash } = randomToken()
    const expiresAt = new Date(now.getTime() + INVITE_DAYS * DAY_MS)
    await insertInvite(trx, { id: randomUUID(), userId, tokenHash: hash, at: now, expiresAt })
    await insertAudit(
      trx,
      {
        userId: actor.userId,
        actor: actor.name,
        action: existing ? 'user.invitedAgain' : 'user.created',
        subject: 'user',
        subjectId: userId,
        details: existing ? {} : { roles: person.roles },
      },
      now,
    )
    return { userId, token, expiresAt }
  })
}

import type { Knex } from 'knex'
import type { Role } from '../../src/shared/contract/permissions.ts'
import { insertAudit } from '../audit/audit.queries.ts'
import { AppError } from '../errors.ts'
import { findUser, findUserByEmail, replaceRoles, setDeactivated, setPasswordHash } from './auth.queries.ts'
import type { UserRow } from './auth.queries.ts'
import { findOpenInvite, useInvite } from './invites.queries.ts'
import type { InviteRow } from './invites.queries.ts'
import type { Passwords } from './passwords.ts'
import { sha256 } from './randomToken.ts'
import type { IssuedTokens, Sessions, SignedInPerson } from './sessions.ts'
import type { SignInGuard } from './signInGuard.ts'

export interface AuthDeps {
  knex: Knex
  sessions: Sessions
  passwords: Passwords
  guard: SignInGuard
  now: () => Date
}

export interface Caller {
  ip: string
  userAgent: string
}

/** Who does something to an account. */
export interface Actor {
  userId: string | null
  name: string
}

export function createAuthService({ knex, sessions, passwords, guard, now }: AuthDeps) {
  const audit = (trx: Knex, user: Pick<UserRow, 'id' | 'name'>, action: string, details = {}) =>
    insertAudit(
      trx,
      { userId: user.id, actor: user.name, action, subject: 'user', subjectId: user.id, details },
      now(),
    )

  return {
    /** The same steps for a wrong name and a wrong password, so that neither answer nor time tells them apart. */
    signIn: async (email: string, password: string, caller: Caller): Promise<IssuedTokens> => {
      const account = email.trim().toLowerCase()
      const attempt = await guard.begin(account, caller.ip)
      const user = await findUserByEmail(knex, account)
      const hash = user?.active ? user.passwordHash : null
      if (!(await passwords.matches(password, hash)) || !user || !hash) throw new AppError('sign-in.wrong')
      const newHash = passwords.isOutdated(hash) ? await passwords.hash(password) : null
      return knex.transaction(async (trx) => {
        await attempt.succeeded(trx)
        if (newHash) await setPasswordHash(trx, user.id, newHash)
        await audit(trx, user, 'session.opened')
        return sessions.open(trx, user.id, caller.userAgent)
      })
    },

    signOut: async ({ person, sessionId }: SignedInPerson, everywhere: boolean): Promise<void> => {
      await sessions.end(
        everywhere ? { userId: person.id } : { sessionId },
        everywhere ? 'signedOutEverywhere' : 'signedOut',
        (trx, ended) => audit(trx, person, 'session.ended', { everywhere, sessions: ended.length }),
      )
    },

    lookAtInvite: async (token: string): Promise<InviteRow> => {
      const invite = await findOpenInvite(knex, sha256(token), now())
      if (!invite) throw new AppError('invite.invalid')
      return invite
    },

    /** Sets the first password and signs in; whatever was signed in with another password before is ended. */
    acceptInvite: async (token: string, password: string, caller: Caller): Promise<IssuedTokens> => {
      const invite = await findOpenInvite(knex, sha256(token), now())
      if (!invite) throw new AppError('invite.invalid')
      const passwordHash = await passwords.hash(password)
      const user = { id: invite.userId, name: invite.name }
      await sessions.end({ userId: user.id }, 'password', async (trx) => {
        if (!(await useInvite(trx, invite.id, now()))) throw new AppError('invite.invalid')
        await setPasswordHash(trx, user.id, passwordHash)
        await audit(trx, user, 'password.set', { by: 'invite' })
      })
      return knex.transaction(async (trx) => {
        await audit(trx, user, 'session.opened')
        return sessions.open(trx, user.id, caller.userAgent)
      })
    },

    /** Ends the person's sessions with it, so that sockets and other terminals do not keep old rights. */
    setRoles: async (actor: Actor, userId: string, roles: readonly Role[]): Promise<void> => {
      await sessions.end({ userId }, 'roles', async (trx) => {
        await replaceRoles(trx, userId, roles)
        await auditAccount(trx, actor, userId, 'user.rolesChanged', { roles }, now())
      })
    },

    deactivate: async (actor: Actor, userId: string): Promise<void> => {
      await sessions.end({ userId }, 'deactivated', async (trx) => {
        if (!(await findUser(trx, userId))) throw new Error(`there is no user ${userId}`)
        await setDeactivated(trx, userId, now())
        await auditAccount(trx, actor, userId, 'user.deactivated', {}, now())
      })
    },
  }
}

export type AuthService = ReturnType<typeof createAuthService>

async function auditAccount(
  trx: Knex,
  actor: Actor,
  userId: string,
  action: string,
  details: Record<string, unknown>,
  at: Date,
): Promise<void> {
  await insertAudit(
    trx,
    { userId: actor.userId, actor: actor.name, action, subject: 'user', subjectId: userId, details },
    at,
  )
}

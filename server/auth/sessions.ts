import { randomUUID } from 'node:crypto'
import type { Knex } from 'knex'
import type { Person } from '../../src/shared/contract/auth.ts'
import { insertAudit } from '../audit/audit.queries.ts'
import type { Config } from '../config.ts'
import { isStorageAway } from '../connect.ts'
import { AppError } from '../errors.ts'
import { createAccessTokens } from './accessTokens.ts'
import { TOKEN_COOKIE, cookieOf } from './cookies.ts'
import {
  deleteOldRefreshTokens,
  endSessions,
  findPerson,
  findPersonOfSession,
  findRefreshToken,
  insertRefreshToken,
  insertSession,
  lockSession,
  markGenerationUsed,
  newestGeneration,
  touchSession,
} from './auth.queries.ts'
import type { EndReason, RefreshTokenRow, SessionRow } from './auth.queries.ts'
import { randomToken, sha256 } from './randomToken.ts'

export interface SignedInPerson {
  person: Person
  sessionId: string
  /** ISO instant until which the short token lasts */
  tokenUntil: string
}

export interface IssuedTokens extends SignedInPerson {
  token: string
  refreshToken: string
}

export interface Sessions {
  /** Who sends these cookies; null: nobody who is signed in now. */
  personOfCookies: (cookieHeader: string | undefined) => Promise<SignedInPerson | null>
  /** The person of a session as of now, for sockets that outlive the short token; null: it has ended. */
  personOfSession: (sessionId: string) => Promise<Person | null>
  /** Opens a session inside the transaction that signs in. */
  open: (trx: Knex, userId: string, userAgent: string) => Promise<IssuedTokens>
  /** Exchanges a refresh token for its successor. */
  refresh: (refreshToken: string | null) => Promise<IssuedTokens>
  /** Ends sessions together with `work`, in one transaction, then tells the listeners. */
  end: (
    which: { sessionId: string } | { userId: string },
    reason: EndReason,
    work: (trx: Knex, endedIds: string[]) => Promise<void>,
  ) => Promise<void>
  /** Called with the ids of sessions that have just ended, so that their sockets are cut; gives the way to stop. */
  onEnded: (listener: (sessionIds: string[], reason: EndReason) => void) => () => void
}

type RefreshOutcome = { issued: IssuedTokens } | { ended: string[] }

/** Two tabs that refresh with the same token within this time are both honest; later it is re-use. */
export const REUSE_GRACE_MS = 10_000

const DAY_MS = 86_400_000
const TIDY_EVERY_MS = 60 * 60_000

/**
 * Each request asks the database whether the session is open: one query by primary key, and a sign-out, a change of
 * role or a deactivation holds from the next request on, whichever process made it. Only while the database is away
 * the last answer, at most as old as the short token lasts, is used: then nothing can be written anyway, and those
 * who watch a run that is not stored yet must not lose sight of it.
 */
export function createSessions(knex: Knex, config: Config, now: () => Date = () => new Date()): Sessions {
  const accessTokens = createAccessTokens(config, now)
  const listeners = new Set<(sessionIds: string[], reason: EndReason) => void>()
  const lastKnown = createLastKnown(config.tokenMinutes * 60_000, now)

  const announce = (ids: string[], reason: EndReason) => {
    for (const id of ids) lastKnown.forget(id)
    if (ids.length > 0) for (const listener of listeners) listener(ids, reason)
  }

  let tidiedAt = 0
  const tidy = async () => {
    const at = now().getTime()
    if (at - tidiedAt < TIDY_EVERY_MS) return
    tidiedAt = at
    await deleteOldRefreshTokens(knex, new Date(at - DAY_MS))
  }

  const expiry = (at: Date) => new Date(at.getTime() + config.sessionDays * DAY_MS)

  const personOfSession = async (sessionId: string): Promise<Person | null> => {
    try {
      const person = await findPersonOfSession(knex, sessionId, now())
      if (person) lastKnown.remember(sessionId, person)
      else lastKnown.forget(sessionId)
      return person
    } catch (error) {
      const known = isStorageAway(error) ? lastKnown.find(sessionId) : null
      if (known) return known
      throw error
    }
  }

  const issue = async (
    trx: Knex,
    who: { person: Person; sessionId: string; generation: number },
  ): Promise<IssuedTokens> => {
    const { person, sessionId, generation } = who
    const refresh = randomToken()
    await insertRefreshToken(trx, { sessionId, hash: refresh.hash, generation, at: now() })
    const { token, until } = accessTokens.issue(person.id, sessionId)
    return { person, sessionId, tokenUntil: until.toISOString(), token, refreshToken: refresh.token }
  }

  const rotate = async (trx: Knex, presented: RefreshTokenRow, session: SessionRow) => {
    const at = now()
    const newest = await newestGeneration(trx, session.id)
    const isCurrent = presented.generation === newest
    const isInGrace =
      presented.generation === newest - 1 &&
      presented.usedAt !== null &&
      at.getTime() - presented.usedAt.getTime() <= REUSE_GRACE_MS
    if (!isCurrent && !isInGrace) return null
    const person = await findPerson(trx, session.userId)
    if (!person) throw new AppError('sign-in.required')
    if (isCurrent) {
      await markGenerationUsed(trx, session.id, newest, at)
      await touchSession(trx, session.id, at, expiry(at))
    }
    return issue(trx, { person, sessionId: session.id, generation: isCurrent ? newest + 1 : newest })
  }

  const endAsReused = async (trx: Knex, session: SessionRow): Promise<string[]> => {
    const ids = await endSessions(trx, { sessionId: session.id }, 'reused', now())
    const entry = { action: 'session.reused', subject: 'session', subjectId: session.id, details: {} }
    await insertAudit(trx, { ...entry, userId: session.userId, actor: 'sign-in guard' }, now())
    return ids
  }

  return {
    personOfSession,
    personOfCookies: async (cookieHeader) => {
      const token = cookieOf(cookieHeader, TOKEN_COOKIE)
      const claims = token && accessTokens.read(token)
      if (!claims) return null
      const person = await personOfSession(claims.sessionId)
      if (!person || person.id !== claims.userId) return null
      return { person, sessionId: claims.sessionId, tokenUntil: claims.until.toISOString() }
    },
    open: async (trx, userId, userAgent) => {
      const at = now()
      const sessionId = randomUUID()
      const person = await findPerson(trx, userId)
      if (!person) throw new AppError('sign-in.required')
      await insertSession(trx, { id: sessionId, userId, at, expiresAt: expiry(at), userAgent })
      return issue(trx, { person, sessionId, generation: 1 })
    },
    refresh: async (refreshToken) => {
      if (!refreshToken) throw new AppError('sign-in.required')
      await tidy()
      const hash = sha256(refreshToken)
      const found = await findRefreshToken(knex, hash)
      if (!found) throw new AppError('sign-in.required')
      // The family's end has to be committed although the caller is refused, so the transaction gives it back.
      const outcome = await knex.transaction(async (trx): Promise<RefreshOutcome> => {
        // The lock comes first: what is read after it shows what other tabs have done meanwhile.
        const session = await lockSession(trx, found.sessionId)
        const presented = await findRefreshToken(trx, hash)
        if (!presented || !session || session.expiresAt <= now()) throw new AppError('sign-in.required')
        if (session.endedAt)
          throw new AppError(session.endReason === 'reused' ? 'sign-in.reused' : 'sign-in.required')
        const issued = await rotate(trx, presented, session)
        return issued ? { issued } : { ended: await endAsReused(trx, session) }
      })
      if ('issued' in outcome) return outcome.issued
      announce(outcome.ended, 'reused')
      throw new AppError('sign-in.reused')
    },
    end: async (which, reason, work) => {
      const ids = await knex.transaction(async (trx) => {
        const ended = await endSessions(trx, which, reason, now())
        await work(trx, ended)
        return ended
      })
      announce(ids, reason)
    },
    onEnded: (listener) => {
      listeners.add(listener)
      return () => listeners.delete(listener)
    },
  }
}

/** The last answers about sessions, for the time that the database is away; bounded. */
function createLastKnown(keepMs: number, now: () => Date) {
  const MOST = 1000
  const known = new Map<string, { person: Person; at: number }>()
  return {
    remember: (sessionId: string, person: Person) => {
      known.delete(sessionId)
      known.set(sessionId, { person, at: now().getTime() })
      if (known.size > MOST) known.delete(known.keys().next().value!)
    },
    forget: (sessionId: string) => known.delete(sessionId),
    find: (sessionId: string): Person | null => {
      const entry = known.get(sessionId)
      return entry && now().getTime() - entry.at <= keepMs ? entry.person : null
    },
  }
}

import type { Knex } from 'knex'
import type { Person } from '../../src/shared/contract/auth.ts'
import { Role, permissionsOf } from '../../src/shared/contract/permissions.ts'

export type EndReason = 'signedOut' | 'signedOutEverywhere' | 'reused' | 'deactivated' | 'roles' | 'password'

export interface UserRow {
  id: string
  name: string
  email: string
  passwordHash: string | null
  active: boolean
}

export interface SessionRow {
  id: string
  userId: string
  expiresAt: Date
  endedAt: Date | null
  endReason: string | null
}

export interface RefreshTokenRow {
  id: number
  sessionId: string
  generation: number
  usedAt: Date | null
}

interface RawUser {
  id: string
  name: string
  email: string
  password_hash: string | null
  deactivated_at: Date | null
}

const USER_COLUMNS = ['id', 'name', 'email', 'password_hash', 'deactivated_at']

function userOf(row: RawUser): UserRow {
  return {
    id: row.id,
    name: row.name,
    email: row.email,
    passwordHash: row.password_hash,
    active: row.deactivated_at === null,
  }
}

export async function findUserByEmail(knex: Knex, email: string): Promise<UserRow | null> {
  const row = await knex('users').where({ email }).first<RawUser | undefined>(USER_COLUMNS)
  return row ? userOf(row) : null
}

export async function findUser(knex: Knex, id: string): Promise<UserRow | null> {
  const row = await knex('users').where({ id }).first<RawUser | undefined>(USER_COLUMNS)
  return row ? userOf(row) : null
}

/** An active person with roles and what they allow; null when there is none. */
export async function findPerson(knex: Knex, userId: string): Promise<Person | null> {
  const rows = await knex('users')
    .leftJoin('user_roles', 'user_roles.user_id', 'users.id')
    .where('users.id', userId)
    .whereNull('users.deactivated_at')
    .select<PersonPart[]>('users.id', 'users.name', 'users.email', 'user_roles.role')
  return personOfRows(rows)
}

/** The person behind a session that is open at `now`, in one query; null when it has ended. */
export async function findPersonOfSession(knex: Knex, sessionId: string, now: Date): Promise<Person | null> {
  const rows = await knex('sessions')
    .join('users', 'users.id', 'sessions.user_id')
    .leftJoin('user_roles', 'user_roles.user_id', 'users.id')
    .where('sessions.id', sessionId)
    .whereNull('sessions.ended_at')
    .where('sessions.expires_at', '>', now)
    .whereNull('users.deactivated_at')
    .select<PersonPart[]>('users.id', 'users.name', 'users.email', 'user_roles.role')
  return personOfRows(rows)
}

interface PersonPart {
  id: string
  name: string
  email: string
  role: string | null
}

function personOfRows(rows: PersonPart[]): Person | null {
  const first = rows[0]
  if (!first) return null
  const held = new Set(rows.map(({ role }) => role))
  const roles = Role.options.filter((role) => held.has(role))
  return { id: first.id, name: first.name, email: first.email, roles, permissions: permissionsOf(roles) }
}

export async function insertUser(
  trx: Knex,
  user: { id: string; name: string; email: string; at: Date },
): Promise<void> {
  await trx('users').insert({ id: user.id, name: user.name, email: user.email, created_at: user.at })
}

export async function setPasswordHash(trx: Knex, userId: string, passwordHash: string): Promise<void> {
  await trx('users').where({ id: userId }).update({ password_hash: passwordHash }).increment('version', 1)
}

export async function replaceRoles(trx: Knex, userId: string, roles: readonly Role[]): Promise<void> {
  await trx('user_roles').where({ user_id: userId }).delete()
  if (roles.length > 0) await trx('user_roles').insert(roles.map((role) => ({ user_id: userId, role })))
  await trx('users').where({ id: userId }).increment('version', 1)
}

export async function setDeactivated(trx: Knex, userId: string, at: Date | null): Promise<void> {
  await trx('users').where({ id: userId }).update({ deactivated_at: at }).increment('version', 1)
}

export async function insertSession(
  trx: Knex,
  session: { id: string; userId: string; at: Date; expiresAt: Date; userAgent: string },
): Promise<void> {
  await trx('sessions').insert({
    id: session.id,
    user_id: session.userId,
    created_at: session.at,
    last_used_at: session.at,
    expires_at: session.expiresAt,
    user_agent: session.userAgent.slice(0, 200),
  })
}

export async function lockSession(trx: Knex, id: string): Promise<SessionRow | null> {
  const row = (await trx('sessions').where({ id }).forUpdate().first()) as
    | { id: string; user_id: string; expires_at: Date; ended_at: Date | null; end_reason: string | null }
    | undefined
  if (!row) return null
  return {
    id: row.id,
    userId: row.user_id,
    expiresAt: row.expires_at,
    endedAt: row.ended_at,
    endReason: row.end_reason,
  }
}

export async function touchSession(trx: Knex, id: string, at: Date, expiresAt: Date): Promise<void> {
  await trx('sessions').where({ id }).update({ last_used_at: at, expires_at: expiresAt })
}

/** Ends what is still open of a session or of all sessions of a person; gives the ids that it ended. */
export async function endSessions(
  trx: Knex,
  which: { sessionId: string } | { userId: string },
  reason: EndReason,
  at: Date,
): Promise<string[]> {
  const where = 'sessionId' in which ? { id: which.sessionId } : { user_id: which.userId }
  const open = await trx('sessions')
    .where(where)
    .whereNull('ended_at')
    .forUpdate()
    .select<{ id: string }[]>('id')
  const ids = open.map(({ id }) => id)
  if (ids.length > 0) await trx('sessions').whereIn('id', ids).update({ ended_at: at, end_reason: reason })
  return ids
}

export async function insertRefreshToken(
  trx: Knex,
  token: { sessionId: string; hash: Buffer; generation: number; at: Date },
): Promise<void> {
  await trx('session_tokens').insert({
    session_id: token.sessionId,
    token_hash: token.hash,
    generation: token.generation,
    issued_at: token.at,
  })
}

export async function findRefreshToken(knex: Knex, hash: Buffer): Promise<RefreshTokenRow | null> {
  const row = (await knex('session_tokens').where({ token_hash: hash }).first()) as
    { id: number; session_id: string; generation: number; used_at: Date | null } | undefined
  if (!row) return null
  return { id: row.id, sessionId: row.session_id, generation: row.generation, usedAt: row.used_at }
}

export async function newestGeneration(trx: Knex, sessionId: string): Promise<number> {
  const row = (await trx('session_tokens')
    .where({ session_id: sessionId })
    .max('generation as generation')
    .first()) as { generation: number | null } | undefined
  return row?.generation ?? 0
}

/** All tokens of the generation are spent at once: siblings were given to tabs that asked at the same time. */
export async function markGenerationUsed(
  trx: Knex,
  sessionId: string,
  generation: number,
  at: Date,
): Promise<void> {
  await trx('session_tokens')
    .where({ session_id: sessionId, generation })
    .whereNull('used_at')
    .update({ used_at: at })
}

/** Tokens of sessions that ended or ran out before `before`: nobody can present them with an effect any more. */
export async function deleteOldRefreshTokens(knex: Knex, before: Date): Promise<void> {
  await knex('session_tokens')
    .whereIn(
      'session_id',
      knex('sessions').select('id').where('expires_at', '<', before).orWhere('ended_at', '<', before),
    )
    .delete()
}

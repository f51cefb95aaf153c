import request from 'supertest'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { API } from '../../../src/shared/contract/routes.ts'
import { REFRESH_COOKIE, TOKEN_COOKIE } from '../../../server/auth/cookies.ts'
import { REUSE_GRACE_MS } from '../../../server/auth/sessions.ts'
import { PASSWORD, addPerson, createTestApp, setCookie } from '../../helpers/testApp.ts'
import type { TestApp } from '../../helpers/testApp.ts'

let test: TestApp
beforeAll(async () => {
  test = await createTestApp()
})
afterAll(() => test.close())

async function firstToken(): Promise<{ refreshToken: string; sessionId: string }> {
  const { email } = await addPerson(test, ['installer'])
  const response = await request(test.app)
    .post(`${API}/auth/sign-in`)
    .send({ email, password: PASSWORD })
    .expect(200)
  return { refreshToken: setCookie(response, REFRESH_COOKIE)!, sessionId: response.body.sessionId }
}

const refresh = (refreshToken: string) =>
  request(test.app).post(`${API}/auth/refresh`).set('Cookie', `${REFRESH_COOKIE}=${refreshToken}`)

const successor = async (refreshToken: string) =>
  setCookie(await refresh(refreshToken).expect(200), REFRESH_COOKIE)!

const me = (token: string) =>
  request(test.app).get(`${API}/auth/me`).set('Cookie', `${TOKEN_COOKIE}=${token}`)

describe('POST /auth/refresh', () => {
  it('gives a new pair of the same session, long after the short token has run out', async () => {
    const first = await firstToken()
    test.clock.advance(3 * 86_400_000)
    const response = await refresh(first.refreshToken).expect(200)
    expect(response.body.sessionId).toBe(first.sessionId)
    expect(setCookie(response, REFRESH_COOKIE)).not.toBe(first.refreshToken)
    await me(setCookie(response, TOKEN_COOKIE)!).expect(200)
  })

  it('keeps a session that is used alive and ends one that is not used for the set days', async () => {
    const { refreshToken } = await firstToken()
    test.clock.advance(13 * 86_400_000)
    const second = await successor(refreshToken)
    test.clock.advance(13 * 86_400_000)
    const third = await successor(second)
    test.clock.advance(14 * 86_400_000)
    expect((await refresh(third).expect(401)).body.code).toBe('sign-in.required')
  })

  it('ends the whole family when a spent token comes again after the grace', async () => {
    const { refreshToken, sessionId } = await firstToken()
    const thief = await refresh(refreshToken).expect(200)
    const ended: string[][] = []
    const stop = test.sessions.onEnded((ids) => ended.push(ids))
    test.clock.advance(REUSE_GRACE_MS + 1)
    const honest = await refresh(refreshToken).expect(401)
    stop()
    expect(honest.body.code).toBe('sign-in.reused')
    expect(setCookie(honest, REFRESH_COOKIE)).toBeNull()
    expect(ended).toEqual([[sessionId]])
    await me(setCookie(thief, TOKEN_COOKIE)!).expect(401)
    const again = await refresh(setCookie(thief, REFRESH_COOKIE)!).expect(401)
    expect(again.body.code).toBe('sign-in.reused')
    const entries = await test
      .knex('audit_entries')
      .where({ action: 'session.reused', subject_id: sessionId })
    expect(entries).toHaveLength(1)
  })

  it('serves two tabs that refresh with the same token, and both go on afterwards', async () => {
    const { refreshToken } = await firstToken()
    const [a, b] = await Promise.all([refresh(refreshToken), refresh(refreshToken)])
    expect([a.status, b.status]).toEqual([200, 200])
    await me(setCookie(a, TOKEN_COOKIE)!).expect(200)
    await me(setCookie(b, TOKEN_COOKIE)!).expect(200)
    test.clock.advance(9 * 60_000)
    // The browser keeps one of the two; whichever it is goes on.
    const next = await successor(setCookie(b, REFRESH_COOKIE)!)
    test.clock.advance(9 * 60_000)
    await refresh(next).expect(200)
  })

  it('serves ten tabs at the same moment', async () => {
    const { refreshToken, sessionId } = await firstToken()
    const answers = await Promise.all(Array.from({ length: 10 }, () => refresh(refreshToken)))
    expect(answers.map(({ status }) => status)).toEqual(Array(10).fill(200))
    const generations = await test
      .knex('session_tokens')
      .where({ session_id: sessionId })
      .distinct('generation')
    expect(generations.map(({ generation }) => generation as number).toSorted()).toEqual([1, 2])
  })

  it('spends siblings together: the one left over is re-use after the grace', async () => {
    const { refreshToken } = await firstToken()
    const a = await successor(refreshToken)
    const b = await successor(refreshToken)
    await successor(a)
    test.clock.advance(REUSE_GRACE_MS + 1)
    expect((await refresh(b).expect(401)).body.code).toBe('sign-in.reused')
  })

  it('refuses a token two generations old even within the grace', async () => {
    const { refreshToken } = await firstToken()
    await successor(await successor(refreshToken))
    expect((await refresh(refreshToken).expect(401)).body.code).toBe('sign-in.reused')
  })

  it('still honours the grace at its last millisecond', async () => {
    const { refreshToken } = await firstToken()
    await successor(refreshToken)
    test.clock.advance(REUSE_GRACE_MS)
    await refresh(refreshToken).expect(200)
  })

  it('refuses an unknown token and none at all, and clears the cookies', async () => {
    const unknown = await refresh('x'.repeat(43)).expect(401)
    expect(unknown.body.code).toBe('sign-in.required')
    expect(unknown.headers['set-cookie']).toHaveLength(2)
    await request(test.app).post(`${API}/auth/refresh`).expect(401)
  })

  it('forgets spent tokens a day after their session has ended, and not before', async () => {
    const { refreshToken, sessionId } = await firstToken()
    await test.sessions.end({ sessionId }, 'signedOut', () => Promise.resolve())
    const left = () => test.knex('session_tokens').where({ session_id: sessionId })
    test.clock.advance(86_400_000)
    await refresh(refreshToken).expect(401)
    expect(await left()).toHaveLength(1)
    test.clock.advance(2 * 3_600_000)
    const other = await firstToken()
    await refresh(other.refreshToken).expect(200)
    expect(await left()).toEqual([])
    expect(await test.knex('session_tokens').where({ session_id: other.sessionId })).toHaveLength(2)
  })

  it('refuses someone who was deactivated meanwhile', async () => {
    const { refreshToken, sessionId } = await firstToken()
    const session = await test.knex('sessions').where({ id: sessionId }).first()
    await test.knex('users').where({ id: session.user_id }).update({ deactivated_at: test.clock.now() })
    expect((await refresh(refreshToken).expect(401)).body.code).toBe('sign-in.required')
  })
})

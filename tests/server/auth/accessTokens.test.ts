import { createHmac } from 'node:crypto'
import jwt from 'jsonwebtoken'
import { describe, expect, it } from 'vitest'
import { createAccessTokens } from '../../../server/auth/accessTokens.ts'
import { createTestClock } from '../../helpers/testApp.ts'

const jwtSecret = 'k3yOfTheTests-0123456789-abcdefghijkl'
const userId = '6a4f3c02-58a5-4a3c-8d1e-0c9f5b8f7a11'
const sessionId = '0f0d9c1b-6f7e-4b7a-9a53-1b7f2f1f7c22'
const clock = createTestClock()
const tokens = createAccessTokens({ jwtSecret, tokenMinutes: 10 }, clock.now)

describe('createAccessTokens()', () => {
  it('reads back what it issued', () => {
    const { token, until } = tokens.issue(userId, sessionId)
    expect(tokens.read(token)).toEqual({ userId, sessionId, until })
    expect(until.getTime() - clock.now().getTime()).toBe(600_000)
  })

  it('signs with HMAC-SHA256 over the given key', () => {
    const [head, body, mark] = tokens.issue(userId, sessionId).token.split('.')
    const expected = createHmac('sha256', jwtSecret).update(`${head}.${body}`).digest('base64url')
    expect(mark).toBe(expected)
  })

  it('refuses another key, no algorithm, another algorithm, another issuer and foreign claims', () => {
    const exp = Math.floor(clock.now().getTime() / 1000) + 60
    const claims = { sub: userId, sid: sessionId, exp, iss: 'evenstrung' }
    const good = jwt.sign(claims, jwtSecret, { algorithm: 'HS256' })
    expect(tokens.read(good)).not.toBeNull()
    expect(tokens.read(jwt.sign(claims, 'x'.repeat(40)))).toBeNull()
    expect(tokens.read(jwt.sign(claims, '', { algorithm: 'none' }))).toBeNull()
    expect(tokens.read(jwt.sign(claims, jwtSecret, { algorithm: 'HS512' }))).toBeNull()
    expect(tokens.read(jwt.sign({ ...claims, iss: 'other' }, jwtSecret))).toBeNull()
    expect(tokens.read(jwt.sign({ exp, iss: 'evenstrung' }, jwtSecret))).toBeNull()
    expect(tokens.read('')).toBeNull()
  })

  it('refuses a token that has run out', () => {
    const { token } = tokens.issue(userId, sessionId)
    clock.advance(599_000)
    expect(tokens.read(token)).not.toBeNull()
    clock.advance(1000)
    expect(tokens.read(token)).toBeNull()
  })
})

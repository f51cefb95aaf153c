import request from 'supertest'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { SignedIn } from '../../../src/shared/contract/auth.ts'
import { Problem } from '../../../src/shared/contract/errors.ts'
import { API } from '../../../src/shared/contract/routes.ts'
import { REFRESH_COOKIE, TOKEN_COOKIE } from '../../../server/auth/cookies.ts'
import type { Passwords } from '../../../server/auth/passwords.ts'
import { PASSWORD, addPerson, createTestApp, setCookie, signedInAgent } from '../../helpers/testApp.ts'
import type { TestApp } from '../../helpers/testApp.ts'

let test: TestApp
const compared: (string | null)[] = []

function watched(passwords: Passwords): Passwords {
  return {
    ...passwords,
    matches: (password, hash) => {
      compared.push(hash)
      return passwords.matches(password, hash)
    },
  }
}

beforeAll(async () => {
  test = await createTestApp({ wrapPasswords: watched })
})
afterAll(() => test.close())

const signIn = (email: string, password: string) =>
  request(test.app).post(`${API}/auth/sign-in`).send({ email, password })

describe('POST /auth/sign-in', () => {
  it('answers with the person, the roles and what they allow', async () => {
    const person = await addPerson(test, ['qc', 'installer'])
    const response = await signIn(person.email, PASSWORD).expect(200)
    const signedIn = SignedIn.parse(response.body)
    expect(signedIn.person).toMatchObject({ id: person.id, name: person.name, roles: ['installer', 'qc'] })
    expect(signedIn.person.permissions).toContain('returnsDecide')
    expect(signedIn.person.permissions).not.toContain('administer')
    expect(signedIn.workshop).toEqual({ name: 'Workshop', timeZone: 'UTC' })
    expect(signedIn.tokenUntil).toBe(new Date(test.clock.now().getTime() + 10 * 60_000).toISOString())
  })

  it('sets two cookies that scripts cannot read and other sites cannot send', async () => {
    const person = await addPerson(test, ['installer'])
    const response = await signIn(person.email, PASSWORD).expect(200)
    const lines = response.headers['set-cookie'] as unknown as string[]
    const token = lines.find((line) => line.startsWith(`${TOKEN_COOKIE}=`))!
    const refresh = lines.find((line) => line.startsWith(`${REFRESH_COOKIE}=`))!
    for (const line of [token, refresh]) {
      expect(line).toContain('HttpOnly')
      expect(line).toContain('SameSite=Strict')
      expect(line).not.toContain('Secure')
    }
    expect(token).toMatch(/Path=\/;/)
    expect(refresh).toContain(`Path=${API}/auth`)
    expect(setCookie(response, REFRESH_COOKIE)).toMatch(/^[\w-]{43}$/)
  })

  it('finds the account whatever the case and the spaces around the e-mail', async () => {
    const person = await addPerson(test, ['installer'])
    await signIn(`  ${person.email.toUpperCase()} `, PASSWORD).expect(200)
  })

  it('gives the same answer and does the same hashing for an unknown name and a wrong password', async () => {
    const person = await addPerson(test, ['installer'])
    compared.length = 0
    const wrongPassword = await signIn(person.email, 'not the password').expect(401)
    const unknownName = await signIn('nobody@harrowlane.test', 'not the password').expect(401)
    expect(compared).toHaveLength(2)
    expect(compared[1]).toBeNull()
    const without = ({ requestId: _id, ...rest }: Record<string, unknown>) => rest
    expect(without(unknownName.body)).toEqual(without(wrongPassword.body))
    expect(Problem.parse(unknownName.body).code).toBe('sign-in.wrong')
    expect(Object.keys(unknownName.headers).sort()).toEqual(Object.keys(wrongPassword.headers).sort())
  })

  it('refuses someone deactivated and someone without a password like an unknown name', async () => {
    const gone = await addPerson(test, ['installer'])
    await test.knex('users').where({ id: gone.id }).update({ deactivated_at: test.clock.now() })
    const invited = await addPerson(test, ['installer'])
    await test.knex('users').where({ id: invited.id }).update({ password_hash: null })
    compared.length = 0
    for (const { email } of [gone, invited])
      expect((await signIn(email, PASSWORD).expect(401)).body.code).toBe('sign-in.wrong')
    expect(compared).toEqual([null, null])
  })

  it('refuses a password that only begins with the right 72 bytes', async () => {
    const person = await addPerson(test, ['installer'])
    const longest = 'p'.repeat(72)
    await test
      .knex('users')
      .where({ id: person.id })
      .update({ password_hash: await test.passwords.hash(longest) })
    await signIn(person.email, `${longest}more`).expect(401)
    await signIn(person.email, longest).expect(200)
  })

  it('makes the hash anew when the cost of the setting has changed', async () => {
    const person = await addPerson(test, ['installer'])
    const { createPasswords } = await import('../../../server/auth/passwords.ts')
    const older = createPasswords({ bcryptCost: 5 })
    await test
      .knex('users')
      .where({ id: person.id })
      .update({ password_hash: await older.hash(PASSWORD) })
    await older.close()
    await signIn(person.email, PASSWORD).expect(200)
    const row = await test.knex('users').where({ id: person.id }).first('password_hash')
    expect(row.password_hash).toMatch(/^\$2[aby]\$04\$/)
    await signIn(person.email, PASSWORD).expect(200)
  })

  it('keeps neither the refresh token nor the password in the database', async () => {
    const person = await addPerson(test, ['installer'])
    const response = await signIn(person.email, PASSWORD).expect(200)
    const refreshToken = setCookie(response, REFRESH_COOKIE)!
    const rows = await test.knex('session_tokens').where({ session_id: response.body.sessionId })
    expect(rows).toHaveLength(1)
    expect(rows[0].token_hash).toHaveLength(32)
    expect(JSON.stringify(rows)).not.toContain(refreshToken)
    const user = await test.knex('users').where({ id: person.id }).first()
    expect(JSON.stringify(user)).not.toContain(PASSWORD)
  })

  it('writes an audit entry that names the person and no secret', async () => {
    const person = await addPerson(test, ['installer'])
    await signIn(person.email, PASSWORD).expect(200)
    const entries = await test.knex('audit_entries').where({ user_id: person.id })
    expect(entries).toMatchObject([{ action: 'session.opened', actor: person.name, subject: 'user' }])
    expect(JSON.stringify(entries)).not.toContain(person.email)
  })
})

describe('GET /auth/me', () => {
  it('tells who is signed in', async () => {
    const person = await addPerson(test, ['lead'])
    const agent = await signedInAgent(test.app, person.email)
    const response = await agent.get(`${API}/auth/me`).expect(200)
    expect(SignedIn.parse(response.body).person.id).toBe(person.id)
  })

  it('refuses without a cookie, with a forged one and after the token has run out', async () => {
    const me = () => request(test.app).get(`${API}/auth/me`)
    expect((await me().expect(401)).body.code).toBe('sign-in.required')
    await me().set('Cookie', `${TOKEN_COOKIE}=not.a.token`).expect(401)
    const person = await addPerson(test, ['lead'])
    const token = setCookie(await signIn(person.email, PASSWORD), TOKEN_COOKIE)!
    await me().set('Cookie', `${TOKEN_COOKIE}=${token}`).expect(200)
    const [head, body, mark] = token.split('.')
    const forged = `${head}.${body}.${mark!.startsWith('A') ? 'B' : 'A'}${mark!.slice(1)}`
    await me().set('Cookie', `${TOKEN_COOKIE}=${forged}`).expect(401)
    test.clock.advance(10 * 60_000 + 1000)
    await me().set('Cookie', `${TOKEN_COOKIE}=${token}`).expect(401)
  })
})

describe('POST /auth/sign-out', () => {
  it('holds from the next request on although the token has not run out', async () => {
    const person = await addPerson(test, ['lead'])
    const token = setCookie(await signIn(person.email, PASSWORD), TOKEN_COOKIE)!
    const cookie = `${TOKEN_COOKIE}=${token}`
    const response = await request(test.app)
      .post(`${API}/auth/sign-out`)
      .set('Cookie', cookie)
      .send({ everywhere: false })
      .expect(200)
    expect(setCookie(response, TOKEN_COOKIE)).toBeNull()
    await request(test.app).get(`${API}/auth/me`).set('Cookie', cookie).expect(401)
  })

  it('leaves other terminals signed in when it is only here', async () => {
    const person = await addPerson(test, ['lead'])
    const here = await signedInAgent(test.app, person.email)
    const there = await signedInAgent(test.app, person.email)
    await here.post(`${API}/auth/sign-out`).send({ everywhere: false }).expect(200)
    await there.get(`${API}/auth/me`).expect(200)
  })

  it('ends every session of the person when it is everywhere, and no one else’s', async () => {
    const person = await addPerson(test, ['lead'])
    const other = await addPerson(test, ['lead'])
    const here = await signedInAgent(test.app, person.email)
    const there = await signedInAgent(test.app, person.email)
    const others = await signedInAgent(test.app, other.email)
    await here.post(`${API}/auth/sign-out`).send({ everywhere: true }).expect(200)
    await there.get(`${API}/auth/me`).expect(401)
    await there.post(`${API}/auth/refresh`).expect(401)
    await others.get(`${API}/auth/me`).expect(200)
  })

  it('tells listeners which sessions ended, so that their sockets can be cut', async () => {
    const person = await addPerson(test, ['lead'])
    const here = await signedInAgent(test.app, person.email)
    const there = await signedInAgent(test.app, person.email)
    const sessions = [here, there].map((agent) => agent.get(`${API}/auth/me`))
    const ids = (await Promise.all(sessions)).map((response) => response.body.sessionId as string)
    const ended: { ids: string[]; reason: string }[] = []
    const stop = test.sessions.onEnded((sessionIds, reason) => ended.push({ ids: sessionIds, reason }))
    await here.post(`${API}/auth/sign-out`).send({ everywhere: true }).expect(200)
    stop()
    expect(ended).toHaveLength(1)
    expect(ended[0]!.reason).toBe('signedOutEverywhere')
    expect(ended[0]!.ids.toSorted()).toEqual(ids.toSorted())
    expect(await test.sessions.personOfSession(ids[0]!)).toBeNull()
  })
})

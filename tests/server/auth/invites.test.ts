import request from 'supertest'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { API } from '../../../src/shared/contract/routes.ts'
import { invitePerson } from '../../../server/auth/people.service.ts'
import { PASSWORD, addPerson, createTestApp, signedInAgent } from '../../helpers/testApp.ts'
import type { TestApp } from '../../helpers/testApp.ts'

let test: TestApp
beforeAll(async () => {
  test = await createTestApp()
})
afterAll(() => test.close())

let no = 0
async function invite() {
  const person = { name: 'New Person', email: `new${++no}@harrowlane.test`, roles: ['admin'] as const }
  const invited = await invitePerson(test.knex, person, { userId: null, name: 'test' }, test.clock.now())
  return { ...person, ...invited! }
}

const look = (token: string) => request(test.app).get(`${API}/invites/${token}`)
const accept = (token: string, password: string) =>
  request(test.app).post(`${API}/invites/accept`).send({ token, password })

describe('one-time link', () => {
  it('shows whom it is for and until when', async () => {
    const { token, email } = await invite()
    const { body } = await look(token).expect(200)
    const expiresAt = new Date(test.clock.now().getTime() + 7 * 86_400_000).toISOString()
    expect(body).toEqual({ name: 'New Person', email, expiresAt })
  })

  it('sets the first password, signs in and works no second time', async () => {
    const { token, email, userId } = await invite()
    const { body } = await accept(token, PASSWORD).expect(200)
    expect(body.person).toMatchObject({ id: userId, roles: ['admin'] })
    await signedInAgent(test.app, email)
    expect((await accept(token, 'another password!').expect(410)).body.code).toBe('invite.invalid')
    await look(token).expect(410)
    const actions = await test
      .knex('audit_entries')
      .where({ subject_id: userId })
      .orderBy('id')
      .pluck('action')
    expect(actions).toEqual(['user.created', 'password.set', 'session.opened', 'session.opened'])
  })

  it('is used by one of two who open it at the same moment', async () => {
    const { token } = await invite()
    const answers = await Promise.all([accept(token, PASSWORD), accept(token, PASSWORD)])
    expect(answers.map(({ status }) => status).toSorted()).toEqual([200, 410])
  })

  it('runs out after seven days', async () => {
    const { token } = await invite()
    test.clock.advance(7 * 86_400_000)
    await look(token).expect(410)
    await accept(token, PASSWORD).expect(410)
  })

  it('stops working when a newer one is made for the same person', async () => {
    const first = await invite()
    const person = { name: first.name, email: first.email, roles: first.roles }
    const second = await invitePerson(test.knex, person, { userId: null, name: 'test' }, test.clock.now())
    await look(first.token).expect(410)
    await accept(second!.token, PASSWORD).expect(200)
    expect(await invitePerson(test.knex, person, { userId: null, name: 'test' }, test.clock.now())).toBeNull()
  })

  it('refuses a password that is too short or that bcrypt would cut, as password.weak', async () => {
    const { token } = await invite()
    for (const password of ['eleven char', 'p'.repeat(73), 'ü'.repeat(37)]) {
      const { body } = await accept(token, password).expect(400)
      expect(body.code).toBe('password.weak')
      expect(body.fields[0].path).toBe('password')
    }
    await accept(token, 'ü'.repeat(36)).expect(200)
  })

  it('keeps only the SHA-256 of its token', async () => {
    const { token, userId } = await invite()
    const rows = await test.knex('invites').where({ user_id: userId })
    expect(rows[0].token_hash).toHaveLength(32)
    expect(JSON.stringify(rows)).not.toContain(token)
  })

  it('is refused for an existing account that has a password', async () => {
    const person = await addPerson(test, ['lead'])
    const wanted = { name: 'x', email: person.email, roles: ['admin'] as const }
    expect(await invitePerson(test.knex, wanted, { userId: null, name: 'test' }, test.clock.now())).toBeNull()
  })
})

import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { API } from '../../../src/shared/contract/routes.ts'
import { createAuthService } from '../../../server/auth/auth.service.ts'
import type { AuthService } from '../../../server/auth/auth.service.ts'
import { createSignInGuard } from '../../../server/auth/signInGuard.ts'
import { addPerson, createTestApp, signedInAgent } from '../../helpers/testApp.ts'
import type { TestApp } from '../../helpers/testApp.ts'

let test: TestApp
let auth: AuthService
beforeAll(async () => {
  test = await createTestApp()
  const { knex, sessions, passwords, clock } = test
  auth = createAuthService({
    knex,
    sessions,
    passwords,
    guard: createSignInGuard(knex, clock.now),
    now: clock.now,
  })
})
afterAll(() => test.close())

const admin = { userId: null, name: 'test admin' }

describe('setRoles()', () => {
  it('ends the person’s sessions, tells the listeners and holds at the next sign-in', async () => {
    const person = await addPerson(test, ['installer'])
    const agent = await signedInAgent(test.app, person.email)
    const reasons: string[] = []
    const stop = test.sessions.onEnded((_ids, reason) => reasons.push(reason))
    await auth.setRoles(admin, person.id, ['returnsDesk'])
    stop()
    expect(reasons).toEqual(['roles'])
    await agent.get(`${API}/auth/me`).expect(401)
    await agent.post(`${API}/auth/refresh`).expect(401)
    const again = await signedInAgent(test.app, person.email)
    const { body } = await again.get(`${API}/auth/me`).expect(200)
    expect(body.person.roles).toEqual(['returnsDesk'])
    const entries = await test
      .knex('audit_entries')
      .where({ action: 'user.rolesChanged', subject_id: person.id })
    expect(entries).toMatchObject([{ actor: 'test admin', subject: 'user' }])
  })

  it('leaves everything as it was when a part of it fails', async () => {
    const person = await addPerson(test, ['installer'])
    const agent = await signedInAgent(test.app, person.email)
    await expect(auth.setRoles(admin, person.id, ['qc', 'qc'])).rejects.toThrow()
    const { body } = await agent.get(`${API}/auth/me`).expect(200)
    expect(body.person.roles).toEqual(['installer'])
  })
})

describe('deactivate()', () => {
  it('ends the person’s sessions and refuses a new sign-in', async () => {
    const person = await addPerson(test, ['installer'])
    const agent = await signedInAgent(test.app, person.email)
    await auth.deactivate(admin, person.id)
    await agent.get(`${API}/auth/me`).expect(401)
    await expect(signedInAgent(test.app, person.email)).rejects.toThrow(/401/)
  })
})

describe('a role that another process takes away', () => {
  it('is gone from the next request on', async () => {
    const person = await addPerson(test, ['installer', 'lead'])
    const agent = await signedInAgent(test.app, person.email)
    await agent.get(`${API}/cautions`).expect(200)
    await test.knex('user_roles').where({ user_id: person.id }).delete()
    await agent.get(`${API}/cautions`).expect(403)
  })
})

import request from 'supertest'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { API } from '../../../src/shared/contract/routes.ts'
import { TOKEN_COOKIE } from '../../../server/auth/cookies.ts'
import { createSessions } from '../../../server/auth/sessions.ts'
import type { Sessions } from '../../../server/auth/sessions.ts'
import { connect } from '../../../server/connect.ts'
import { createCuttableProxy } from '../../helpers/cuttableProxy.ts'
import { PASSWORD, addPerson, createTestApp, setCookie } from '../../helpers/testApp.ts'
import type { TestApp } from '../../helpers/testApp.ts'

let test: TestApp
let proxy: Awaited<ReturnType<typeof createCuttableProxy>>
let knex: ReturnType<typeof connect>
let sessions: Sessions

beforeAll(async () => {
  test = await createTestApp()
  const url = new URL(test.database.url)
  proxy = await createCuttableProxy({ host: url.hostname, port: Number(url.port) })
  url.port = String(proxy.port)
  knex = connect(url.href, 2)
  sessions = createSessions(knex, test.config, test.clock.now)
})
afterAll(async () => {
  await proxy.cut()
  await knex.destroy()
  await test.close()
})

async function signedInCookie() {
  const { email } = await addPerson(test, ['installer'])
  const response = await request(test.app)
    .post(`${API}/auth/sign-in`)
    .send({ email, password: PASSWORD })
    .expect(200)
  return { cookie: `${TOKEN_COOKIE}=${setCookie(response, TOKEN_COOKIE)}`, email }
}

describe('sessions while the database is away', () => {
  it('still know whom they saw before, know nobody else, and ask again when it is back', async () => {
    const seen = await signedInCookie()
    const ended = await signedInCookie()
    const unseen = await signedInCookie()
    expect((await sessions.personOfCookies(seen.cookie))!.person.email).toBe(seen.email)
    const { sessionId } = (await sessions.personOfCookies(ended.cookie))!
    await sessions.end({ sessionId }, 'signedOut', () => Promise.resolve())

    await proxy.cut()
    expect((await sessions.personOfCookies(seen.cookie))!.person.email).toBe(seen.email)
    await expect(sessions.personOfCookies(unseen.cookie)).rejects.toThrow()
    await expect(sessions.personOfCookies(ended.cookie)).rejects.toThrow()

    await proxy.mend()
    expect(await sessions.personOfCookies(ended.cookie)).toBeNull()
    expect((await sessions.personOfCookies(unseen.cookie))!.person.email).toBe(unseen.email)
  })

  it('do not know anyone longer than the short token lasts', async () => {
    const { cookie } = await signedInCookie()
    const { sessionId } = (await sessions.personOfCookies(cookie))!
    await proxy.cut()
    test.clock.advance(10 * 60_000 + 1)
    await expect(sessions.personOfSession(sessionId)).rejects.toThrow()
    expect(await sessions.personOfCookies(cookie)).toBeNull()
  })
})

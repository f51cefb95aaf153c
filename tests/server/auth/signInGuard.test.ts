import { randomUUID } from 'node:crypto'
import request from 'supertest'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { API } from '../../../src/shared/contract/routes.ts'
import type { Passwords } from '../../../server/auth/passwords.ts'
import { PASSWORD, addPerson, createTestApp } from '../../helpers/testApp.ts'
import type { TestApp } from '../../helpers/testApp.ts'

let test: TestApp
let compared = 0

function counted(passwords: Passwords): Passwords {
  return {
    ...passwords,
    matches: (password, hash) => {
      compared++
      return passwords.matches(password, hash)
    },
  }
}

beforeAll(async () => {
  test = await createTestApp({ env: { TRUST_PROXY: '1' }, wrapPasswords: counted })
})
afterAll(() => test.close())

let lastAddress = 0
const newAddress = () => `10.1.${Math.floor(++lastAddress / 250)}.${(lastAddress % 250) + 1}`

const tryAt = (address: string, email: string, password: string) =>
  request(test.app).post(`${API}/auth/sign-in`).set('X-Forwarded-For', address).send({ email, password })

async function failUntilWait(address: string, email: string): Promise<number> {
  for (let no = 0; no < 50; no++) {
    const response = await tryAt(address, email, 'wrong')
    if (response.status === 429) return no
  }
  throw new Error('the delay never began')
}

describe('sign-in delay', () => {
  it('begins after three failures of an account and names the seconds, also as Retry-After', async () => {
    const { email } = await addPerson(test, ['installer'])
    const address = newAddress()
    expect(await failUntilWait(address, email)).toBe(3)
    const response = await tryAt(address, email, PASSWORD).expect(429)
    expect(response.body).toMatchObject({ code: 'sign-in.wait', facts: { waitSeconds: 1 } })
    expect(response.headers['retry-after']).toBe('1')
  })

  it('treats a name that nobody has the same way', async () => {
    expect(await failUntilWait(newAddress(), `${randomUUID()}@harrowlane.test`)).toBe(3)
  })

  it('counts by account from whatever address the tries come', async () => {
    const { email } = await addPerson(test, ['installer'])
    for (let no = 0; no < 3; no++) await tryAt(newAddress(), email, 'wrong').expect(401)
    await tryAt(newAddress(), email, PASSWORD).expect(429)
  })

  it('counts by address over many names', async () => {
    const address = newAddress()
    for (let no = 0; no < 10; no++)
      await tryAt(address, `${randomUUID()}@harrowlane.test`, 'wrong').expect(401)
    await tryAt(address, `${randomUUID()}@harrowlane.test`, 'wrong').expect(429)
  })

  it('does no hashing while it refuses, and a refused try does not lengthen the wait', async () => {
    const { email } = await addPerson(test, ['installer'])
    const address = newAddress()
    await failUntilWait(address, email)
    compared = 0
    for (let no = 0; no < 5; no++) await tryAt(address, email, 'wrong').expect(429)
    expect(compared).toBe(0)
    test.clock.advance(1000)
    await tryAt(address, email, PASSWORD).expect(200)
  })

  it('lets the right password in after at most 60 s, however many tries failed before', async () => {
    const { email } = await addPerson(test, ['installer'])
    const address = newAddress()
    let longest = 0
    for (let no = 0; no < 25; no++) {
      const response = await tryAt(address, email, 'wrong')
      if (response.status !== 429) continue
      longest = Math.max(longest, response.body.facts.waitSeconds)
      test.clock.advance(response.body.facts.waitSeconds * 1000)
    }
    expect(longest).toBe(60)
    test.clock.advance(60_000)
    await tryAt(address, email, PASSWORD).expect(200)
  })

  it('starts anew for the account after a success', async () => {
    const { email } = await addPerson(test, ['installer'])
    const address = newAddress()
    await tryAt(address, email, 'wrong').expect(401)
    await tryAt(address, email, 'wrong').expect(401)
    await tryAt(address, email, PASSWORD).expect(200)
    expect(await failUntilWait(address, email)).toBe(3)
  })

  it('does not let strangers keep an account’s owner out of the terminal that they use', async () => {
    const { email } = await addPerson(test, ['installer'])
    const terminal = newAddress()
    await tryAt(terminal, email, PASSWORD).expect(200)
    for (let no = 0; no < 3; no++) await tryAt(newAddress(), email, 'wrong').expect(401)
    await tryAt(newAddress(), email, 'wrong').expect(429)
    await tryAt(terminal, email, PASSWORD).expect(200)
  })

  it('does not let failures of others keep people out of a terminal that they share', async () => {
    const { email } = await addPerson(test, ['installer'])
    const terminal = newAddress()
    await tryAt(terminal, email, PASSWORD).expect(200)
    for (let no = 0; no < 10; no++)
      await tryAt(terminal, `${randomUUID()}@harrowlane.test`, 'wrong').expect(401)
    await tryAt(terminal, `${randomUUID()}@harrowlane.test`, 'wrong').expect(429)
    await tryAt(terminal, email, PASSWORD).expect(200)
  })

  it('counts tries that come at the same moment one by one', async () => {
    const { email } = await addPerson(test, ['installer'])
    const address = newAddress()
    const answers = await Promise.all(Array.from({ length: 8 }, () => tryAt(address, email, 'wrong')))
    const statuses = answers.map(({ status }) => status).toSorted()
    expect(statuses).toEqual([401, 401, 401, 429, 429, 429, 429, 429])
  })

  it('survives a restart, because it is kept in the database', async () => {
    const { email } = await addPerson(test, ['installer'])
    await failUntilWait(newAddress(), email)
    const { createSignInGuard } = await import('../../../server/auth/signInGuard.ts')
    const afterRestart = createSignInGuard(test.knex, test.clock.now)
    await expect(afterRestart.begin(email, newAddress())).rejects.toMatchObject({ code: 'sign-in.wait' })
  })

  it('keeps neither names nor addresses, and tidies what counts no more', async () => {
    const { email } = await addPerson(test, ['installer'])
    const address = newAddress()
    await tryAt(address, email, 'wrong').expect(401)
    const rows = await test.knex('sign_in_attempts')
    expect(JSON.stringify(rows)).not.toContain(email)
    expect(JSON.stringify(rows)).not.toContain(address)
    test.clock.advance(2 * 60 * 60_000)
    await tryAt(newAddress(), email, PASSWORD).expect(200)
    const kinds = await test.knex('sign_in_attempts').distinct('kind')
    expect(kinds.map(({ kind }) => kind as string).toSorted()).toEqual(['address', 'known'])
    test.clock.advance(91 * 86_400_000)
    await tryAt(newAddress(), email, 'wrong').expect(401)
    expect(await test.knex('sign_in_attempts').where({ kind: 'known' })).toEqual([])
  })
})

import request from 'supertest'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { API } from '../../../src/shared/contract/routes.ts'
import { createByLink, readWanted } from '../../../server/cli/adminCreate.ts'
import { PASSWORD, createTestApp } from '../../helpers/testApp.ts'
import type { TestApp } from '../../helpers/testApp.ts'

let test: TestApp
beforeAll(async () => {
  test = await createTestApp()
})
afterAll(() => test.close())

const env = () => ({
  DATABASE_URL: test.database.url,
  DATA_DIR: '/nonexistent/evenstrung',
  JWT_SECRET: 'k3yOfTheTests-0123456789-abcdefghijkl',
})
const args = ['--email', 'First@Harrowlane.test', '--name', 'First Person']

describe('admin:create', () => {
  it('gives a link with which a first admin signs in', async () => {
    const { link } = await createByLink(args, env(), test.clock.now())
    expect(link).toMatch(/^http:\/\/127\.0\.0\.1:4180\/invite\/[\w-]{43}$/)
    const token = link.split('/').at(-1)!
    const { body } = await request(test.app)
      .post(`${API}/invites/accept`)
      .send({ token, password: PASSWORD })
      .expect(200)
    expect(body.person).toMatchObject({
      name: 'First Person',
      email: 'first@harrowlane.test',
      roles: ['admin'],
    })
    await expect(createByLink(args, env(), test.clock.now())).rejects.toThrow(/has an account already/)
  })

  it('puts the public address into the link', async () => {
    const other = ['--email', 'second@harrowlane.test', '--name', 'Second', '--role', 'lead', '--role', 'qc']
    const PUBLIC_URL = 'https://bench.harrowlane.test'
    const { link } = await createByLink(other, { ...env(), PUBLIC_URL }, test.clock.now())
    expect(link).toMatch(/^https:\/\/bench\.harrowlane\.test\/invite\//)
    const created = await test
      .knex('audit_entries')
      .where({ action: 'user.created' })
      .orderBy('id', 'desc')
      .first()
    expect(created).toMatchObject({ actor: 'command line', user_id: null })
  })

  it('says how to use it when something is missing or not right', () => {
    expect(() => readWanted([])).toThrow(/^--email is missing or not right\. Use: npm run admin:create/)
    expect(() => readWanted(['--email', 'nonsense', '--name', 'x'])).toThrow(/^--email/)
    expect(() => readWanted(['--email', 'a@harrowlane.test'])).toThrow(/^--name/)
    expect(() => readWanted([...args, '--role', 'owner'])).toThrow(/^--role/)
    expect(() => readWanted([...args, '--nonsense'])).toThrow(/^Use:/)
  })
})

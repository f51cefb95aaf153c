import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { refuseDemoAccounts } from '../../server/refuseDemoAccounts.ts'
import { addPerson, createTestApp } from '../helpers/testApp.ts'
import type { TestApp } from '../helpers/testApp.ts'

let test: TestApp
beforeAll(async () => {
  test = await createTestApp()
})
afterAll(() => test.close())

const production = { mode: 'production', dataDir: '/data', hasDemoBenchTokens: false } as const

describe('refuseDemoAccounts()', () => {
  it('lets production start with real people only, and the demo with anyone', async () => {
    await addPerson(test, ['admin'])
    await refuseDemoAccounts(test.knex, production)
    const demo = await addPerson(test, ['installer'], { isDemo: true })
    await expect(refuseDemoAccounts(test.knex, production)).rejects.toThrow(
      /^This database holds demo accounts/,
    )
    await refuseDemoAccounts(test.knex, { ...production, mode: 'demo' })
    await test.knex('users').where({ id: demo.id }).update({ deactivated_at: test.clock.now() })
    await refuseDemoAccounts(test.knex, production)
  })

  it('refuses production with the tokens of demo benches', async () => {
    const config = { ...production, hasDemoBenchTokens: true }
    await expect(refuseDemoAccounts(test.knex, config)).rejects.toThrow(/tokens of demo benches/)
  })
})

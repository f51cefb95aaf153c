import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { API } from '../../../src/shared/contract/routes.ts'
import { ModelView } from '../../../src/shared/contract/workshop.ts'
import { addModel, addRevision } from '../../helpers/records.ts'
import { addPerson, createTestApp, signedInAgent } from '../../helpers/testApp.ts'
import type { TestApp } from '../../helpers/testApp.ts'

let test: TestApp
let agent: Awaited<ReturnType<typeof signedInAgent>>

beforeAll(async () => {
  test = await createTestApp()
  const { email } = await addPerson(test, ['engineer'])
  agent = await signedInAgent(test.app, email)
})
afterAll(() => test.close())

const at = (ms: number) => new Date(test.clock.now().getTime() + ms)

describe('GET /models', () => {
  it('lists models by name with the revision in force now: neither a draft, nor an older, nor a later one', async () => {
    const b = await addModel(test.knex, 'B', { key: 'BB' })
    const a = await addModel(test.knex, 'A', { key: 'AA' })
    await addRevision(test.knex, b, { no: 1, status: 'withdrawn', inForceFrom: at(-3000) })
    await addRevision(test.knex, b, { no: 2, status: 'inForce', inForceFrom: at(-2000) })
    const current = await addRevision(test.knex, b, { no: 3, status: 'inForce', inForceFrom: at(-1000) })
    const coming = await addRevision(test.knex, b, { no: 4, status: 'inForce', inForceFrom: at(1000) })
    await addRevision(test.knex, b, { no: 5, status: 'draft', inForceFrom: null })
    const list = async () => {
      const { body } = await agent.get(`${API}/models`).expect(200)
      return (body.items as unknown[]).map((item) => ModelView.parse(item))
    }
    const models = await list()
    expect(models.map(({ id }) => id)).toEqual([a, b])
    expect(models[0]!.sheetInForce).toBeNull()
    expect(models[0]!.sheet).toBeNull()
    expect(models[1]!.sheet).toMatchObject({ id: current, revision: 3, modelId: b })
    expect(models[1]!.sheetInForce).toMatchObject({
      id: current,
      revision: 3,
      inForceFrom: at(-1000).toISOString(),
    })
    test.clock.advance(1000)
    expect((await list())[1]!.sheetInForce!.id).toBe(coming)
  })
})

import { randomUUID } from 'node:crypto'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { API } from '../../../src/shared/contract/routes.ts'
import { isAcknowledged } from '../../../server/cautions/cautions.service.ts'
import { addPerson, createTestApp, signedInAgent } from '../../helpers/testApp.ts'
import type { TestApp } from '../../helpers/testApp.ts'

let test: TestApp
beforeAll(async () => {
  test = await createTestApp({ env: { SESSION_DAYS: '90', TOKEN_MINUTES: '60' } })
  await test.knex('workshop_settings').insert({
    id: 1,
    name: 'Harrow Lane Instruments',
    time_zone: 'Europe/London',
    shifts: JSON.stringify([
      { name: 'early', from: '06:00' },
      { name: 'late', from: '14:00' },
    ]),
    serial_pattern: '',
  })
})
afterAll(() => test.close())

describe('cautions', () => {
  it('are acknowledged once per person and shift', async () => {
    const person = await addPerson(test, ['installer'])
    const agent = await signedInAgent(test.app, person.email)
    const before = await agent.get(`${API}/cautions`).expect(200)
    expect(before.body).toEqual({ acknowledged: false, shift: '2026-03-04 early', acknowledgedAt: null })
    const accepted = await agent.post(`${API}/cautions`).send({ id: randomUUID() }).expect(200)
    const acknowledgedAt = test.clock.now().toISOString()
    expect(accepted.body).toEqual({ acknowledged: true, shift: '2026-03-04 early', acknowledgedAt })
    const asked = () => isAcknowledged(test.knex, test.config, person.id, test.clock.now())
    expect(await asked()).toBe(true)

    test.clock.advance(60_000)
    const again = await agent.post(`${API}/cautions`).send({ id: randomUUID() }).expect(200)
    expect(again.body.acknowledgedAt).toBe(acknowledgedAt)
    const entries = await test
      .knex('audit_entries')
      .where({ user_id: person.id, action: 'cautions.acknowledged' })
    expect(entries).toHaveLength(1)
  })

  it('are asked for again in the next shift', async () => {
    const person = await addPerson(test, ['installer'])
    const agent = await signedInAgent(test.app, person.email)
    await agent.post(`${API}/cautions`).send({ id: randomUUID() }).expect(200)
    test.clock.advance(5 * 3_600_000)
    expect(await isAcknowledged(test.knex, test.config, person.id, test.clock.now())).toBe(false)
    await agent.post(`${API}/auth/refresh`).expect(200)
    const { body } = await agent.get(`${API}/cautions`).expect(200)
    expect(body).toMatchObject({ acknowledged: false, shift: '2026-03-04 late' })
  })

  it('do not count for someone else', async () => {
    const [one, other] = [await addPerson(test, ['installer']), await addPerson(test, ['installer'])]
    const agent = await signedInAgent(test.app, one.email)
    await agent.post(`${API}/cautions`).send({ id: randomUUID() }).expect(200)
    expect(await isAcknowledged(test.knex, test.config, other.id, test.clock.now())).toBe(false)
  })

  it('are stored once when two screens of a person accept them at the same moment', async () => {
    const person = await addPerson(test, ['installer'])
    const agent = await signedInAgent(test.app, person.email)
    const answers = await Promise.all(
      Array.from({ length: 4 }, () => agent.post(`${API}/cautions`).send({ id: randomUUID() })),
    )
    expect(answers.map(({ status }) => status)).toEqual([200, 200, 200, 200])
    expect(await test.knex('caution_acknowledgements').where({ user_id: person.id })).toHaveLength(1)
  })
})

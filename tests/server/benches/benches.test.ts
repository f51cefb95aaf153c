import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { fromJson } from '../../../server/runs/runs.queries.ts'
import { API } from '../../../src/shared/contract/routes.ts'
import { BenchView } from '../../../src/shared/contract/workshop.ts'
import {
  addBench,
  addInstrument,
  addModel,
  addOpenRun,
  addRevision,
  addVerification,
} from '../../helpers/records.ts'
import { addPerson, createTestApp, signedInAgent } from '../../helpers/testApp.ts'
import type { TestApp, TestPerson } from '../../helpers/testApp.ts'

let test: TestApp
let person: TestPerson
let agent: Awaited<ReturnType<typeof signedInAgent>>
const hour = 3_600_000

beforeAll(async () => {
  test = await createTestApp()
  person = await addPerson(test, ['installer'])
  agent = await signedInAgent(test.app, person.email)
})
afterAll(() => test.close())

const at = (ms: number) => new Date(test.clock.now().getTime() + ms)

async function read(id: string): Promise<BenchView | undefined> {
  const { body } = await agent.get(`${API}/benches`).expect(200)
  return (body.items as unknown[]).map((item) => BenchView.parse(item)).find((bench) => bench.id === id)
}

describe('GET /benches', () => {
  it('tells whether a bench is enrolled and connected', async () => {
    const id = await addBench(test.knex, { name: 'Door', code: 'BENCH02', enrolled: false })
    expect(await read(id)).toMatchObject({ enrolled: false, connected: false, channelKind: 'six' })
    test.hub.connected.add(id)
    expect(await read(id)).toMatchObject({ connected: true })
    test.hub.connected.delete(id)
  })

  it('counts the newest verification only, while it holds and if it passed', async () => {
    const id = await addBench(test.knex, { name: 'Window', code: 'BENCH01' })
    expect(await read(id)).toMatchObject({ verified: false, verifiedAt: null, verifiedUntil: null })
    await addVerification(test.knex, id, { at: at(-2 * hour), passed: true, validUntil: at(10 * hour) })
    expect(await read(id)).toMatchObject({ verified: true, verifiedUntil: at(10 * hour).toISOString() })
    await addVerification(test.knex, id, { at: at(-hour), passed: false, validUntil: null })
    expect(await read(id)).toMatchObject({ verified: false, verifiedAt: at(-hour).toISOString() })
    await addVerification(test.knex, id, { at: at(0), passed: true, validUntil: at(1) })
    expect(await read(id)).toMatchObject({ verified: true })
    test.clock.advance(1)
    expect(await read(id)).toMatchObject({ verified: false })
  })

  it('names the run that is open on a bench and who opened it', async () => {
    const { knex } = test
    const benchId = await addBench(knex, { name: 'Corner', code: 'BENCH03' })
    const modelId = await addModel(knex)
    const instrumentId = await addInstrument(knex, modelId, 'HL2400001', at(0))
    const sheetId = await addRevision(knex, modelId, { no: 1, status: 'inForce', inForceFrom: at(0) })
    const runId = await addOpenRun(knex, { instrumentId, modelId, benchId, sheetId, userId: person.id })
    expect((await read(benchId))!.openRun).toEqual({ id: runId, serial: 'HL2400001', person: person.name })
  })

  it('leaves retired benches out', async () => {
    const id = await addBench(test.knex, { name: 'Old', code: 'BENCH09', retiredAt: at(0) })
    expect(await read(id)).toBeUndefined()
  })
})

describe('POST /benches/:id/simulation', () => {
  const simulate = (id: string) => agent.post(`${API}/benches/${id}/simulation`).send({ kind: 'damp' })

  it('hands the command to a simulated bench that is connected', async () => {
    const id = await addBench(test.knex, { name: 'Sim', code: 'BENCH11' })
    expect((await simulate(id).expect(409)).body.code).toBe('bench.offline')
    expect(test.hub.commands).toEqual([])
    test.hub.connected.add(id)
    await simulate(id).expect(200)
    expect(test.hub.commands).toEqual([{ benchId: id, command: { kind: 'damp' } }])
  })

  it('refuses a real bench and one that is not there', async () => {
    const id = await addBench(test.knex, { name: 'Real', code: 'BENCH12', simulated: false })
    test.hub.connected.add(id)
    expect((await simulate(id).expect(409)).body.code).toBe('bench.not-simulated')
    const unknown = '0b8f7d1e-6c58-4f0c-9a3e-111111111111'
    expect((await simulate(unknown).expect(404)).body.code).toBe('bench.unknown')
  })

  it('lets only the opener of the run on it, or a lead, command a bench', async () => {
    const { knex } = test
    const benchId = await addBench(knex, { name: 'Busy', code: 'BENCH13' })
    test.hub.connected.add(benchId)
    const modelId = await addModel(knex)
    const instrumentId = await addInstrument(knex, modelId, 'HL2400002', at(0))
    const sheetId = await addRevision(knex, modelId, { no: 1, status: 'inForce', inForceFrom: at(0) })
    await addOpenRun(knex, { instrumentId, modelId, benchId, sheetId, userId: person.id })
    const command = async (of: TestPerson) =>
      (await signedInAgent(test.app, of.email))
        .post(`${API}/benches/${benchId}/simulation`)
        .send({ kind: 'damp' })
    const refused = await command(await addPerson(test, ['installer']))
    expect(refused.status).toBe(403)
    expect(refused.body).toMatchObject({ code: 'run.not-yours', facts: { person: person.name } })
    expect((await command(person)).status).toBe(200)
    expect((await command(await addPerson(test, ['lead']))).status).toBe(200)
  })

  it('keeps in the audit trail which instrument was placed by whom', async () => {
    const id = await addBench(test.knex, { name: 'Placed', code: 'BENCH14' })
    test.hub.connected.add(id)
    const place = { kind: 'place', seed: 7, faults: [], scatterDb: 1 }
    await simulate(id).expect(200)
    await agent.post(`${API}/benches/${id}/simulation`).send(place).expect(200)
    const entries = await test.knex('audit_entries').where({ subject_id: id })
    expect(entries).toHaveLength(1)
    expect(entries[0]).toMatchObject({ action: 'bench.placed', user_id: person.id, actor: person.name })
    expect(fromJson(entries[0].details)).toEqual(place)
  })
})

import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { API } from '../../../src/shared/contract/routes.ts'
import { ScanTarget } from '../../../src/shared/contract/workshop.ts'
import { addBench, addInstrument, addModel, addOpenRun, addRevision } from '../../helpers/records.ts'
import { addPerson, createTestApp, signedInAgent } from '../../helpers/testApp.ts'
import type { TestApp } from '../../helpers/testApp.ts'

let test: TestApp
let agent: Awaited<ReturnType<typeof signedInAgent>>
let benchId: string
let runId: string

beforeAll(async () => {
  test = await createTestApp()
  const person = await addPerson(test, ['installer'])
  agent = await signedInAgent(test.app, person.email)
  const { knex } = test
  const modelId = await addModel(knex, 'Larch Concert')
  const at = test.clock.now()
  const instrumentId = await addInstrument(knex, modelId, 'HL2401873', at)
  await addInstrument(knex, modelId, 'HLO1', at)
  await addInstrument(knex, modelId, 'HL01', at)
  benchId = await addBench(knex, { name: 'Window', code: 'BENCH01' })
  const sheetId = await addRevision(knex, modelId, { no: 1, status: 'inForce', inForceFrom: at })
  runId = await addOpenRun(knex, { instrumentId, modelId, benchId, sheetId, userId: person.id })
})
afterAll(() => test.close())

const scan = async (code: string) =>
  ScanTarget.parse((await agent.get(`${API}/scan/${encodeURIComponent(code)}`).expect(200)).body)

describe('GET /scan/:code', () => {
  it('finds an instrument by its serial, also from a scanner that types small letters', async () => {
    const found = { kind: 'instrument', serial: 'HL2401873', modelName: 'Larch Concert' }
    expect(await scan('HL2401873')).toEqual(found)
    expect(await scan(' hl2401873 ')).toEqual(found)
  })

  it('finds an instrument whose serial was read with O for 0 or I for 1', async () => {
    expect(await scan('HL24O1873')).toMatchObject({ kind: 'instrument', serial: 'HL2401873' })
    expect(await scan('HL240I873')).toMatchObject({ kind: 'instrument', serial: 'HL2401873' })
  })

  it('prefers the exact serial and guesses between two never', async () => {
    expect(await scan('HLO1')).toMatchObject({ kind: 'instrument', serial: 'HLO1' })
    expect(await scan('HL01')).toMatchObject({ kind: 'instrument', serial: 'HL01' })
    expect(await scan('HLOI')).toEqual({ kind: 'unknownSerial', serial: 'HLOI' })
  })

  it('finds a bench by its label, a run by its id and both by their address', async () => {
    expect(await scan('bench01')).toEqual({ kind: 'bench', benchId, name: 'Window' })
    expect(await scan(runId)).toEqual({ kind: 'run', runId })
    expect(await scan(`https://bench.harrowlane.test/runs/${runId}`)).toEqual({ kind: 'run', runId })
  })

  it('tells a serial that is not known from what is no serial', async () => {
    expect(await scan('HL2499999')).toEqual({ kind: 'unknownSerial', serial: 'HL2499999' })
    for (const code of ['A-1', 'ab', '???', '0b8f7d1e-6c58-4f0c-9a3e-111111111111'])
      expect((await agent.get(`${API}/scan/${encodeURIComponent(code)}`).expect(400)).body.code).toBe(
        'serial.invalid',
      )
  })
})

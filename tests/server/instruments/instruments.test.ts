import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { API } from '../../../src/shared/contract/routes.ts'
import { InstrumentSummary, InstrumentView } from '../../../src/shared/contract/workshop.ts'
import { addInstrument, addModel } from '../../helpers/records.ts'
import { addPerson, createTestApp, signedInAgent } from '../../helpers/testApp.ts'
import type { TestApp } from '../../helpers/testApp.ts'

let test: TestApp
let agent: Awaited<ReturnType<typeof signedInAgent>>
let modelId: string
const at = new Date('2026-02-03T10:00:00.123Z')

beforeAll(async () => {
  test = await createTestApp()
  const { email } = await addPerson(test, ['returnsDesk'])
  agent = await signedInAgent(test.app, email)
  modelId = await addModel(test.knex, 'Larch Concert')
  // Seven in the same millisecond, then three later ones.
  for (let no = 1; no <= 7; no++) await addInstrument(test.knex, modelId, `HL240100${no}`, at)
  for (let no = 8; no <= 9; no++)
    await addInstrument(test.knex, modelId, `HL240100${no}`, new Date(at.getTime() + no))
  await addInstrument(test.knex, modelId, 'LOI1', new Date(at.getTime() + 10), {
    runs: 2,
    lastRunAt: at,
    lastVerdict: 'fail',
  })
})
afterAll(() => test.close())

const list = async (query: string) => (await agent.get(`${API}/instruments?${query}`).expect(200)).body
const serials = (body: { items: { serial: string }[] }) => body.items.map(({ serial }) => serial)

describe('GET /instruments', () => {
  it('lists the newest first with model and standing', async () => {
    const { items, next } = await list('limit=3')
    expect(serials({ items })).toEqual(['LOI1', 'HL2401009', 'HL2401008'])
    expect(InstrumentSummary.parse(items[0])).toMatchObject({
      modelName: 'Larch Concert',
      runs: 2,
      lastVerdict: 'fail',
      lastRunAt: at.toISOString(),
    })
    expect(next).not.toBeNull()
  })

  it('pages through all of them once, also those made in the same millisecond', async () => {
    const seen: string[] = []
    let after = ''
    for (let pages = 0; pages < 10; pages++) {
      const page = await list(`limit=3${after}`)
      seen.push(...serials(page))
      if (page.next === null) break
      after = `&after=${encodeURIComponent(page.next)}`
    }
    expect(seen).toHaveLength(10)
    expect(new Set(seen).size).toBe(10)
    expect(seen.slice(0, 3)).toEqual(['LOI1', 'HL2401009', 'HL2401008'])
  })

  it('gives no next when the last page is exactly full', async () => {
    expect((await list('limit=10')).next).toBeNull()
  })

  it('keeps a page where it was when newer ones come in between', async () => {
    const first = await list('limit=2')
    const newer = await addInstrument(test.knex, modelId, 'HL2499999', new Date(at.getTime() + 100))
    const second = await list(`limit=2&after=${encodeURIComponent(first.next)}`)
    expect(serials(second)[0]).toBe('HL2401008')
    await test.knex('instruments').where({ id: newer }).delete()
  })

  it('finds a part of a serial whichever way O, 0, I and 1 were read, in any case and with gaps', async () => {
    expect(serials(await list('search=1003'))).toEqual(['HL2401003'])
    expect(serials(await list('search=IOO3'))).toEqual(['HL2401003'])
    expect(serials(await list('search=hl24-o1 oo3'))).toEqual(['HL2401003'])
    expect(serials(await list('search=l01i'))).toEqual(['LOI1'])
    expect(serials(await list('search=hl24'))).toHaveLength(9)
  })

  it('finds a part of the model’s name, page by page', async () => {
    expect(serials(await list('search=larch'))).toHaveLength(10)
    expect(serials(await list('search=oak'))).toEqual([])
    const first = await list('search=concert&limit=6')
    const second = await list(`search=concert&limit=6&after=${encodeURIComponent(first.next)}`)
    expect(new Set([...serials(first), ...serials(second)]).size).toBe(10)
    expect(serials(second)).toHaveLength(4)
  })

  it('finds nothing for signs that are in no serial, and takes none of them as a wildcard', async () => {
    expect(serials(await list(`search=${encodeURIComponent('%')}`))).toEqual([])
    expect(serials(await list(`search=${encodeURIComponent('_')}`))).toEqual([])
    expect(serials(await list(`search=${encodeURIComponent("' OR 1=1 --")}`))).toEqual([])
    expect(serials(await list('search=&limit=1'))).toEqual(['LOI1'])
  })

  it('refuses a made-up place and a limit out of range', async () => {
    for (const query of ['after=made-up', 'after=2026-01-01T00:00:00.000Z_nothing', 'limit=0', 'limit=101']) {
      const { body } = await agent.get(`${API}/instruments?${query}`).expect(400)
      expect(body.code).toBe('request.invalid')
      expect(body.fields[0].path).toBe(query.split('=')[0])
    }
  })
})

describe('GET /instruments/:serial', () => {
  it('gives the instrument, its model and its runs', async () => {
    const { body } = await agent.get(`${API}/instruments/HL2401003`).expect(200)
    const view = InstrumentView.parse(body)
    expect(view.instrument.serial).toBe('HL2401003')
    expect(view.model).toMatchObject({ id: modelId, name: 'Larch Concert', strings: 'six' })
    expect(view.runs).toEqual([])
  })

  it('answers 404 for a serial that is not known and 400 for what is no serial', async () => {
    const unknown = await agent.get(`${API}/instruments/HL9999999`).expect(404)
    expect(unknown.body).toMatchObject({ code: 'instrument.unknown', facts: { serial: 'HL9999999' } })
    expect((await agent.get(`${API}/instruments/hl-1`).expect(400)).body.code).toBe('request.invalid')
  })
})

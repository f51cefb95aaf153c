import { afterAll, beforeAll, expect, test } from 'vitest'
import { enrolBench, readWantedBench } from '../../../server/cli/benchEnrol.ts'
import { sayHello } from '../../helpers/benchTalk.ts'
import { once, startTestServer } from '../../helpers/runningServer.ts'
import type { TestServer } from '../../helpers/runningServer.ts'

let at: TestServer

beforeAll(async () => {
  at = await startTestServer()
})
afterAll(() => at.close())

const NOW = new Date('2026-12-01T09:00:00.000Z')

test('enrolBench() makes a bench whose token is known to the caller alone', async () => {
  const { token, isNew } = await enrolBench(at.knex, readWantedBench(['--name', 'Loft']), NOW)
  expect(isNew).toBe(true)
  const row = await at.knex('benches').where({ name: 'Loft' }).first<{ code: string; token_hash: Buffer }>()
  expect(row.code).toBe('BENCHLOFT')
  expect(row.token_hash.toString('base64url')).not.toBe(token)
  expect(await sayHello(at.bench(token))).toMatchObject({ ok: true, name: 'Loft', verified: false })
})

test('enrolBench() gives the bench that is not enrolled yet its first token, and a later one replaces it', async () => {
  const first = await enrolBench(at.knex, readWantedBench(['--name', 'Yard']), NOW)
  expect(first.isNew).toBe(false)
  const second = await enrolBench(at.knex, readWantedBench(['--name', 'Yard']), NOW)
  const refused = (await once(at.bench(first.token), 'connect_error')) as Error & { data: { code: string } }
  expect(refused.data.code).toBe('bench.token')
  expect(await sayHello(at.bench(second.token))).toMatchObject({ ok: true, name: 'Yard' })
  const entries = await at
    .knex('audit_entries')
    .where('action', 'like', 'bench.%')
    .orderBy('id')
    .pluck('action')
  expect(entries).toEqual(['bench.enrolled', 'bench.tokenReplaced', 'bench.tokenReplaced'])
})

test('enrolBench() leaves simulated benches alone', async () => {
  await expect(enrolBench(at.knex, readWantedBench(['--name', 'Window']), NOW)).rejects.toThrow(
    /simulated bench/,
  )
})

test('readWantedBench() asks for what is missing', () => {
  expect(() => readWantedBench([])).toThrow(/--name is missing/)
  expect(() => readWantedBench(['--name', 'Yard', '--code', 'a b'])).toThrow(/Use:/)
  expect(() => readWantedBench(['--colour', 'red'])).toThrow(/Use:/)
})

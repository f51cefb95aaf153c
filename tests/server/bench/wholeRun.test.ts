import { randomUUID } from 'node:crypto'
import { afterAll, afterEach, beforeAll, expect, test } from 'vitest'
import { recomputeRuns } from '../../../server/cli/recompute.ts'
import type { FaultId } from '../../../src/shared/contract/simulation.ts'
import type { RunView } from '../../../src/shared/contract/runs.ts'
import { startOf } from '../../helpers/benchTalk.ts'
import { startTestServer } from '../../helpers/runningServer.ts'
import type { TestPerson, TestServer } from '../../helpers/runningServer.ts'
import { benchReady, startSimulator } from '../../helpers/simulatorProcess.ts'

let at: TestServer
let installer: TestPerson
let endBench: () => void = () => undefined

beforeAll(async () => {
  at = await startTestServer()
  installer = await at.signIn('installer')
  await installer.call('cautions.acknowledge', { body: { id: randomUUID() } })
})

afterEach(async () => {
  endBench()
  await expect
    .poll(async () => (await installer.call('benches.list')).items.filter((bench) => bench.connected))
    .toEqual([])
})
afterAll(() => at.close())

async function checkOnBench(
  bench: 'window' | 'door',
  serial: string,
  fault?: FaultId,
  stringNo?: number,
): Promise<RunView> {
  endBench = startSimulator(at.url, at.benchTokens[bench]!, ['--bench', bench, '--seed', '11'])
  const benchId = await benchReady(installer, bench === 'window' ? 'Window' : 'Door')
  const simulate = (body: unknown) => installer.call('benches.simulate', { params: { id: benchId }, body })
  await simulate({
    kind: 'place',
    seed: 4,
    faults: fault ? [{ fault, stringNo, severity: 1 }] : [],
    scatterDb: 0.4,
  })
  await simulate({ kind: 'automaticHand', on: true, speed: 30 })
  const run = await installer.call('runs.start', { body: startOf(serial, { benchId }) })
  const view = () => installer.call('runs.read', { params: { id: run.id } })
  await expect.poll(async () => (await view()).storage, { timeout: 60_000, interval: 100 }).toBe('stored')
  return view()
}

test(
  'a sound instrument passes on the six-channel bench, and computing it again gives the same bits',
  { timeout: 90_000 },
  async () => {
    const view = await checkOnBench('window', 'HL2700001')
    expect(view.measured.results.filter((r) => r.result !== 'within' && r.required)).toEqual([])
    expect(view).toMatchObject({ status: 'sealed', measured: { verdict: 'pass', phase: 'done' } })
    for (const string of view.measured.strings) expect(string).toMatchObject({ state: 'done' })
    const report = await installer.call('runs.recompute', { params: { id: view.id } })
    expect(report).toMatchObject({ sameVerdict: true, sameBits: true, differences: [] })
    const trace = await installer.call('runs.trace', { params: { id: view.id } })
    expect(trace.frames).toBe(view.measured.frames)
    expect(trace.segments.reduce((sum, segment) => sum + segment.frames, 0)).toBe(trace.frames)
    const page = await installer.call('instruments.read', { params: { serial: 'HL2700001' } })
    expect(page).toMatchObject({ instrument: { lastVerdict: 'pass', runs: 1 }, runs: [{ verdict: 'pass' }] })
  },
)

test('an open element fails its string by name on the six-channel bench', { timeout: 90_000 }, async () => {
  const view = await checkOnBench('window', 'HL2700002', 'elementOpen', 3)
  expect(view.measured.verdict).toBe('fail')
  expect(view.measured.results).toContainEqual(
    expect.objectContaining({ rule: 'speaks', stringNo: 3, result: 'outside', why: 'noSignal' }),
  )
  expect(view.measured.strings[2]).toMatchObject({ state: 'silent', level: { atMost: true } })
})

test('a sound instrument passes on the one-channel bench', { timeout: 90_000 }, async () => {
  const view = await checkOnBench('door', 'HL2700003')
  expect(view.measured.results.filter((r) => r.result !== 'within' && r.required)).toEqual([])
  expect(view.measured.verdict).toBe('pass')
})

test('every stored run computes to the same bits', async () => {
  const { runs, differing } = await recomputeRuns(at.knex, null, (report) =>
    expect(report.differences).toEqual([]),
  )
  expect({ runs, differing }).toEqual({ runs: 3, differing: 0 })
})

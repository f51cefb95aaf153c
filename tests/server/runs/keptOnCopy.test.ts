import { randomUUID } from 'node:crypto'
import path from 'node:path'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { loadDump, writeDump } from '../../../db/dump.js'
import { recomputeRuns } from '../../../server/cli/recompute.ts'
import { connect } from '../../../server/connect.ts'
import { findRun } from '../../../server/runs/runs.queries.ts'
import type { MeasuredRun } from '../../../src/shared/contract/measured.ts'
import type { RecomputeReport, RunView } from '../../../src/shared/contract/runs.ts'
import { sayHello, sendFrames, startOf } from '../../helpers/benchTalk.ts'
import { createEmptyDatabase } from '../../helpers/emptyDatabase.ts'
import { SIX_CHANNEL } from '../../helpers/runSetup.ts'
import { startTestServer } from '../../helpers/runningServer.ts'
import type { TestPerson, TestServer } from '../../helpers/runningServer.ts'
import { temporaryFolder } from '../../helpers/temporaryFolder.ts'
import { buildCheck } from '../../helpers/traceBuilder.ts'

let at: TestServer
let installer: TestPerson
let run: RunView

const BATCH = 200

/** A whole check over the bench's socket, as fast as it is taken. */
async function sealedRun(serial: string): Promise<RunView> {
  const bench = at.bench(at.benchTokens.window!)
  await sayHello(bench, { capabilities: SIX_CHANNEL })
  const started = await installer.call('runs.start', { body: startOf(serial) })
  const { frames, events } = buildCheck({ setup: started.setup })
  for (let from = 0; from < frames.length; from += BATCH) {
    const answer = await sendFrames(bench, {
      run: started.id,
      from,
      frames: frames.slice(from, from + BATCH),
      events: events.filter((event) => event.frame >= from && event.frame < from + BATCH),
    })
    if (!answer.ok) break
  }
  const read = () => installer.call('runs.read', { params: { id: started.id } })
  await expect.poll(async () => (await read()).storage).toBe('stored')
  return read()
}

beforeAll(async () => {
  at = await startTestServer()
  installer = await at.signIn('installer')
  await installer.call('cautions.acknowledge', { body: { id: randomUUID() } })
})

afterAll(() => at.close())

test('a run is stored in segments, its end with the last of them', async () => {
  run = await sealedRun('HL2680001')
  expect(run.status).toBe('sealed')
  const trace = await installer.call('runs.trace', { params: { id: run.id } })
  expect(trace.segments.length).toBeGreaterThan(1)
  expect(trace.segments[0]!.frames).toBe(3000)
  const audit = await at.knex('audit_entries').where({ subject_id: run.id }).orderBy('id').select('action')
  expect(audit).toEqual([{ action: 'run.opened' }, { action: 'run.sealed' }])
})

test('on a restored backup every run computes to the same bits, and what was changed is found', async () => {
  const file = path.join(temporaryFolder(), 'workshop.sql.gz')
  const copy = await createEmptyDatabase()
  const knex = connect(copy.ownerUrl, 2)
  try {
    await writeDump(at.ownerUrl, file)
    await loadDump(copy.ownerUrl, file, true)
    const reports: RecomputeReport[] = []
    const again = () => recomputeRuns(knex, null, (report) => reports.push(report))

    expect(await again()).toEqual({ runs: 1, differing: 0 })
    expect(reports).toMatchObject([{ run: run.id, sameBits: true, sameVerdict: true }])

    const stored = await findRun(knex, run.id)
    const update = (measured: MeasuredRun) =>
      knex('run_details')
        .where({ run_seq: stored!.seq })
        .update({ measured: JSON.stringify(measured) })
    const altered = structuredClone(stored!.measured!)
    altered.strings[0]!.level.value! += 1e-12
    await update(altered)
    expect(await again()).toEqual({ runs: 1, differing: 1 })
    expect(reports.at(-1)!.differences.join()).toMatch(/strings\.0\.level\.value/)
    await update(stored!.measured!)
    expect(await again()).toEqual({ runs: 1, differing: 0 })

    const segment = await knex('trace_segments')
      .orderBy('no')
      .first<{ id: number; data: Buffer }>('id', 'data')
    const changed = Buffer.from(segment.data)
    changed[changed.length - 9]! ^= 1
    await knex('trace_segments').where({ id: segment.id }).update({ data: changed })
    expect(await again()).toEqual({ runs: 1, differing: 1 })
    expect(reports.at(-1)!.differences.join()).toMatch(/does not match its SHA-256/)

    await knex('trace_segments').where({ id: segment.id }).delete()
    expect(await again()).toEqual({ runs: 1, differing: 1 })
  } finally {
    await knex.destroy()
    await copy.drop()
  }
})

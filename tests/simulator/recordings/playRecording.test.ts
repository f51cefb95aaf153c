import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { DEMO_PASSWORD } from '../../../server/cli/seed.ts'
import type { RunView } from '../../../src/shared/contract/runs.ts'
import { ApiClient } from '../../../simulator/recordings/apiClient.ts'
import { playRecording } from '../../../simulator/recordings/playRecording.ts'
import type { RecordingKind } from '../../../simulator/recordings/proofRecordings.ts'
import { isAsExpected, resultLines } from '../../../simulator/recordings/resultLines.ts'
import { WavSource } from '../../../simulator/sources/wavSource.ts'
import { recordings } from '../../helpers/recordings.ts'
import { startTestServer } from '../../helpers/runningServer.ts'
import type { TestServer } from '../../helpers/runningServer.ts'

/** First proof: recordings that this project did not make, through the real server and the real database. */
const proof = recordings()
let server: TestServer
let api: ApiClient
beforeAll(async () => {
  server = await startTestServer()
  api = new ApiClient(server.url)
  await api.signIn('installer@harrowlane.test', DEMO_PASSWORD)
})
afterAll(() => server.close())

async function play(kind: RecordingKind, serial: string): Promise<RunView> {
  return await playRecording(api, {
    url: server.url,
    token: server.benchTokens.recordings!,
    bench: 'Recordings',
    serial,
    source: new WavSource(proof.file[kind]),
    log: () => undefined,
  })
}

const droppedIn = (run: RunView) => run.measured.plucks.flatMap(({ dropped }) => (dropped ? [dropped] : []))

describe('a recording through the real server and database', () => {
  it.each([
    ['sixChannels', 'HL9900011'],
    ['oneChannel', 'HL9900012'],
  ] as const)(
    '%s is sealed with balances and scatter within 0.10 dB of sox, and passes',
    async (kind, serial) => {
      const run = await play(kind, serial)
      expect(run).toMatchObject({ serial, status: 'sealed', storage: 'stored', reason: 'recording' })
      expect(run.measured.verdict).toBe('pass')
      expect(run.measured.plucks.map(({ stringNo, toldBy }) => [stringNo, toldBy])).toEqual(
        proof.plucks[kind].map(({ stringNo }) => [stringNo, 'pitch']),
      )
      expect(isAsExpected(run.measured, proof.expectedBalanceDb)).toBe(true)
      for (const { sDb } of run.measured.strings) expect(Math.abs(sDb! - 1)).toBeLessThan(0.1)

      const report = await api.call('runs.recompute', { params: { id: run.id } })
      expect(report).toMatchObject({ sameVerdict: true, sameBits: true, differences: [] })
    },
    60_000,
  )

  it.each([
    ['digitalSilence', 'HL9900013', 'none', []],
    ['clipping', 'HL9900014', 'none', ['clipped', 'clipped', 'clipped']],
    ['undampedRepluck', 'HL9900015', 'none', ['notDamped']],
    ['strumSix', 'HL9900016', 'none', ['strum', 'strum', 'strum']],
    ['strumOne', 'HL9900017', 'none', ['strum', 'strum', 'strum']],
    ['deadString', 'HL9900018', 'fail', ['belowFloor', 'belowFloor', 'belowFloor']],
  ] as const)(
    '%s (%s) ends in verdict %s, with %j dropped',
    async (kind, serial, verdict, dropped) => {
      const run = await play(kind, serial)
      expect(run).toMatchObject({ status: 'sealed', storage: 'stored' })
      expect(run.measured.verdict).toBe(verdict)
      expect(droppedIn(run)).toEqual(dropped)
      expect(resultLines(run.measured, null).at(-1)).toBe(
        `Verdict: ${verdict === 'none' ? 'no verdict' : verdict}`,
      )
    },
    60_000,
  )

  it('says in a sentence what is wrong when the server refuses', async () => {
    const stranger = new ApiClient(server.url)
    await expect(stranger.signIn('installer@harrowlane.test', 'not the password')).rejects.toThrow(
      /^E-mail or password is wrong\. Try again/,
    )
    await expect(new ApiClient('http://127.0.0.1:9').signIn('a', 'b')).rejects.toThrow(
      /does not answer.*npm start/,
    )
  })
})

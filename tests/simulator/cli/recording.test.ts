import { execFile } from 'node:child_process'
import path from 'node:path'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { DEMO_PASSWORD } from '../../../server/cli/seed.ts'
import { recordings } from '../../helpers/recordings.ts'
import { startTestServer } from '../../helpers/runningServer.ts'
import type { TestServer } from '../../helpers/runningServer.ts'
import { projectDir } from '../../helpers/sources.ts'
import { temporaryFolder } from '../../helpers/temporaryFolder.ts'

let server: TestServer
beforeAll(async () => {
  server = await startTestServer()
})
afterAll(() => server.close())

interface Ended {
  code: number
  out: string
  err: string
}

/** The command as a process of its own, as a newcomer types it. */
function recording(args: string[], env: Record<string, string> = {}): Promise<Ended> {
  const tsx = path.join(projectDir, 'node_modules/tsx/dist/cli.mjs')
  const script = path.join(projectDir, 'simulator/cli/recording.ts')
  return new Promise((resolve) => {
    execFile(
      process.execPath,
      [tsx, script, ...args],
      {
        env: {
          PATH: process.env.PATH,
          HOME: process.env.HOME,
          EVENSTRUNG_URL: server.url,
          EVENSTRUNG_BENCH_TOKEN: server.benchTokens.recordings,
          EVENSTRUNG_EMAIL: 'installer@harrowlane.test',
          EVENSTRUNG_PASSWORD: DEMO_PASSWORD,
          ...env,
        },
      },
      (error, out, err) => resolve({ code: error ? Number(error.code) : 0, out, err }),
    )
  })
}

describe('npm run recording', () => {
  it('makes a recording with sox, plays it into a run and prints six balances beside the expected ones', async () => {
    const ended = await recording(['--kind', 'one', '--serial', 'HL9900021'], { DATA_DIR: temporaryFolder() })
    expect(ended.err).toBe('')
    const lines = ended.out.split('\n')
    const rows = lines.filter((line) => /^ *[1-6] [EBGDA] +3 /.test(line))
    expect(rows).toHaveLength(6)
    for (const row of rows) expect(Math.abs(Number(row.trim().split(/\s+/).at(-1)))).toBeLessThan(0.1)
    expect(lines).toContain('Verdict: pass')
    expect(ended.out).toMatch(/Stored for HL9900021: http.*\/runs\/[0-9a-f-]{36}/)
    expect(ended.code).toBe(0)
  }, 120_000)

  it('plays a file of one’s own, and then expects nothing of it', async () => {
    const { file } = recordings()
    const ended = await recording(['--file', file.strumOne, '--serial', 'HL9900022'])
    expect(ended.out).toMatch(/was dropped: strum/)
    expect(ended.out).toMatch(/Verdict: no verdict/)
    expect(ended.out).not.toMatch(/expected/)
    expect(ended.code).toBe(0)
  }, 120_000)

  it.each<[string, string[], Record<string, string>, number, RegExp]>([
    ['a serial that is none', ['--serial', 'no serial'], {}, 2, /--serial is not right: letters and digits/],
    ['an option that is not known', ['--fil', 'x.wav'], {}, 2, /--fil/],
    ['a file that is not there', ['--file', '/none.wav'], {}, 1, /none\.wav cannot be opened: ENOENT/],
    [
      'a server that is not there',
      ['--file', recordings().file.oneChannel, '--url', 'http://127.0.0.1:9'],
      {},
      1,
      /does not answer\. Start it with: npm start/,
    ],
    [
      'nobody to sign in',
      ['--file', recordings().file.oneChannel],
      { EVENSTRUNG_EMAIL: '', DATA_DIR: '/nowhere' },
      2,
      /EVENSTRUNG_EMAIL and EVENSTRUNG_PASSWORD/,
    ],
  ])(
    'says in a sentence that there is %s',
    async (_, args, env, code, says) => {
      const ended = await recording(args, env)
      expect(ended.err).toMatch(says)
      expect(ended.err).not.toMatch(/at .*\.ts:\d/)
      expect(ended.code).toBe(code)
    },
    60_000,
  )
})

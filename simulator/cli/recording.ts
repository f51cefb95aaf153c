import { readFileSync } from 'node:fs'
import path from 'node:path'
import { parseArgs } from 'node:util'
import { z } from 'zod'
import { Serial } from '../../src/shared/contract/runs.ts'
import { OptionError, readBenchOptions } from '../benchOptions.ts'
import { ApiClient } from '../recordings/apiClient.ts'
import { playRecording } from '../recordings/playRecording.ts'
import { proofRecordings } from '../recordings/proofRecordings.ts'
import { isAsExpected, resultLines } from '../recordings/resultLines.ts'
import { RecordingError } from '../signal/recordingError.ts'
import { WavSource } from '../sources/wavSource.ts'

const USAGE = `Plays a recording as a bench into a run on a running server, and prints what was measured.
  npm run recording                     six strings made by sox, six channels
  npm run recording -- --kind one       the same at the output jack: one channel
  npm run recording -- --file X.wav     a recording of yours, with six channels or one
  --serial SERIAL   --bench NAME   --url ADDRESS   --real-time
  --offset-db DB[,DB...]   dBV minus mathematical rms dBFS   --use-channels 1,2,3,4,5,6
Signs in with EVENSTRUNG_EMAIL and EVENSTRUNG_PASSWORD, or with the demo's installer.`

const DEFAULT_SERIAL = 'HL9900001'
const USAGE_EXIT = 2

function readArguments(args: string[]) {
  try {
    return parseArgs({
      args,
      strict: true,
      options: {
        help: { type: 'boolean' },
        file: { type: 'string' },
        kind: { type: 'string', default: 'six' },
        serial: { type: 'string', default: DEFAULT_SERIAL },
        bench: { type: 'string', default: 'recordings' },
        url: { type: 'string' },
        'real-time': { type: 'boolean', default: false },
        'offset-db': { type: 'string' },
        'use-channels': { type: 'string' },
      },
    }).values
  } catch (error) {
    throw new OptionError(`${error instanceof Error ? error.message : String(error)}\n${USAGE}`)
  }
}

const DemoAccounts = z.array(
  z.object({ email: z.string(), password: z.string(), roles: z.array(z.string()) }),
)

/** Who runs the check: from the environment, else the installer of the demo workshop. */
function account(env: NodeJS.ProcessEnv, dataDir: string): { email: string; password: string } {
  if (env.EVENSTRUNG_EMAIL && env.EVENSTRUNG_PASSWORD)
    return { email: env.EVENSTRUNG_EMAIL, password: env.EVENSTRUNG_PASSWORD }
  try {
    const text = readFileSync(path.join(dataDir, 'demo-accounts.json'), 'utf8')
    const installer = DemoAccounts.parse(JSON.parse(text)).find(({ roles }) => roles.includes('installer'))
    if (installer) return installer
  } catch {
    // no demo here: the sentence below says what to do
  }
  throw new OptionError('Set EVENSTRUNG_EMAIL and EVENSTRUNG_PASSWORD to someone who may run checks.')
}

function say(line: string): void {
  process.stdout.write(`${line}\n`)
}

async function main(): Promise<void> {
  const given = readArguments(process.argv.slice(2))
  if (given.help) {
    say(USAGE)
    return
  }
  const serial = Serial.safeParse(given.serial)
  if (!serial.success) throw new OptionError(`--serial is not right: ${serial.error.issues[0]!.message}.`)
  if (given.kind !== 'six' && given.kind !== 'one') throw new OptionError('--kind is six or one.')
  const dataDir = process.env.DATA_DIR ?? '.data'
  const proof = given.file === undefined ? proofRecordings(path.join(dataDir, 'recordings')) : null
  const file = given.file ?? proof!.file[given.kind === 'six' ? 'sixChannels' : 'oneChannel']
  const passedOn = (['url', 'offset-db', 'use-channels'] as const).flatMap((name) =>
    given[name] === undefined ? [] : [`--${name}=${given[name]}`],
  )
  const options = readBenchOptions(['--bench', given.bench, '--source', 'wav', '--file', file, ...passedOn], {
    ...process.env,
    DATA_DIR: dataDir,
  })
  const { email, password } = account(process.env, dataDir)
  const source = new WavSource(file, {
    offsetDb: options.offsetDb,
    realTime: given['real-time'],
    ...(options.useChannels === null ? {} : { useChannels: options.useChannels }),
  })
  if (source.missingBytes > 0) say(`The recording was cut off: ${source.missingBytes} bytes are missing.`)
  say(`Recording: ${file}`)
  const api = new ApiClient(options.url)
  await api.signIn(email, password)
  const run = await playRecording(api, { ...options, serial: serial.data, source, log: say })
  say('')
  for (const line of resultLines(run.measured, proof?.expectedBalanceDb ?? null)) say(line)
  say(`Stored for ${run.serial}: ${options.url}/runs/${run.id}`)
  if (proof && !isAsExpected(run.measured, proof.expectedBalanceDb)) {
    say('A balance is more than 0.10 dB from what sox expects.')
    process.exitCode = 1
  }
}

try {
  await main()
} catch (error) {
  if (!(error instanceof OptionError || error instanceof RecordingError)) throw error
  process.stderr.write(`${error.message}\n`)
  process.exitCode = error instanceof OptionError ? USAGE_EXIT : 1
}

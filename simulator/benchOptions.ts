import { readFileSync } from 'node:fs'
import path from 'node:path'
import { parseArgs } from 'node:util'
import { z } from 'zod'
import { SAMPLE_CODINGS } from './signal/sampleFormat.ts'
import type { SampleCoding } from './signal/sampleFormat.ts'

/** What stands on the command line and in the environment of a bench. */
export interface BenchOptions {
  /** name of the bench record, for its token */
  bench: string
  url: string
  token: string
  source: 'model' | 'wav' | 'pcm'
  seed: number
  speed: number
  hand: boolean
  channelKind: 'six' | 'one'
  circuit: 'buffered' | 'parallel'
  frameMs: 5 | 10
  mainsHz: 50 | 60
  file: string | null
  realTime: boolean | null
  offsetDb: number | number[]
  useChannels: number[] | null
  rateHz: number
  coding: SampleCoding
  channels: number
}

/** A mistake on the command line, told in one sentence. */
export class OptionError extends Error {}

export const USAGE = `A bench that speaks to an Evenstrung server.
  --bench NAME         window (six channels), door (one channel at the jack) or the name of another bench record
  --url ADDRESS        server; or EVENSTRUNG_URL. The token comes from EVENSTRUNG_BENCH_TOKEN or DATA_DIR/secrets.json
  --source model|wav|pcm
  model: --seed N  --speed X (how many times faster than the clock)  --hand (the automatic hand works from the start)
         --kind six|one  --circuit buffered|parallel
  wav:   --file FILE  --real-time (else as fast as the server takes it)
  pcm:   --rate HZ  --format ${SAMPLE_CODINGS.join('|')}  --channels N  --no-real-time (samples on standard input)
  both:  --offset-db DB[,DB...] (dBV minus mathematical rms dBFS)  --use-channels 1,2,3,4,5,6
  --frame-ms 5|10  --mains 50|60`

const bounded = (low: number, high: number) => z.coerce.number().min(low).max(high)
const list = z
  .string()
  .transform((text) => text.split(',').map(Number))
  .pipe(z.array(z.number()))

const Options = z.object({
  bench: z.string().regex(/^[a-z0-9-]{1,40}$/, 'small letters, digits and hyphens'),
  url: z.url(),
  source: z.enum(['model', 'wav', 'pcm']),
  seed: bounded(0, 4_294_967_295).pipe(z.int()),
  speed: bounded(0.5, 50),
  hand: z.boolean(),
  kind: z.enum(['six', 'one']),
  circuit: z.enum(['buffered', 'parallel']),
  'frame-ms': z.enum(['5', '10']).transform((text) => (text === '5' ? 5 : 10)),
  mains: z.enum(['50', '60']).transform((text) => (text === '50' ? 50 : 60)),
  file: z.string().optional(),
  'real-time': z.boolean().optional(),
  'offset-db': list,
  'use-channels': list.optional(),
  rate: bounded(1000, 768_000),
  format: z.enum(SAMPLE_CODINGS as [SampleCoding, ...SampleCoding[]]),
  channels: bounded(1, 64).pipe(z.int()),
})

/** Reads the command line; throws OptionError with a sentence that says what to put right. */
export function readBenchOptions(args: string[], env: NodeJS.ProcessEnv): BenchOptions {
  const given = parse(args)
  const bench = given.bench ?? 'window'
  const checked = Options.safeParse({
    url: env.EVENSTRUNG_URL,
    source: 'model',
    seed: bench === 'door' ? '2' : '1',
    speed: '1',
    hand: false,
    kind: bench === 'door' ? 'one' : 'six',
    circuit: 'buffered',
    'frame-ms': '10',
    mains: '50',
    'offset-db': '0',
    rate: '48000',
    format: 's24le',
    channels: '6',
    ...given,
    bench,
  })
  if (!checked.success) {
    const issue = checked.error.issues[0]!
    const name = issue.path.map(String).join('.')
    throw new OptionError(
      name === 'url' && given.url === undefined && env.EVENSTRUNG_URL === undefined
        ? 'The address of the server is missing: give --url or EVENSTRUNG_URL.'
        : `--${name} is not right: ${issue.message}.`,
    )
  }
  const values = checked.data
  if (values.source === 'wav' && values.file === undefined)
    throw new OptionError('--source wav needs --file.')
  const offsets = values['offset-db']
  return {
    bench: values.bench,
    url: values.url.replace(/\/+$/, ''),
    token: benchToken(values.bench, env),
    source: values.source,
    seed: values.seed,
    speed: values.speed,
    hand: values.hand,
    channelKind: values.kind,
    circuit: values.circuit,
    frameMs: values['frame-ms'],
    mainsHz: values.mains,
    file: values.file ?? null,
    realTime: values['real-time'] ?? null,
    offsetDb: offsets.length === 1 ? offsets[0]! : offsets,
    useChannels: values['use-channels'] ?? null,
    rateHz: values.rate,
    coding: values.format,
    channels: values.channels,
  }
}

function parse(args: string[]) {
  try {
    return parseArgs({
      args,
      strict: true,
      allowNegative: true,
      options: {
        bench: { type: 'string' },
        url: { type: 'string' },
        source: { type: 'string' },
        seed: { type: 'string' },
        speed: { type: 'string' },
        hand: { type: 'boolean' },
        kind: { type: 'string' },
        circuit: { type: 'string' },
        'frame-ms': { type: 'string' },
        mains: { type: 'string' },
        file: { type: 'string' },
        'real-time': { type: 'boolean' },
        'offset-db': { type: 'string' },
        'use-channels': { type: 'string' },
        rate: { type: 'string' },
        format: { type: 'string' },
        channels: { type: 'string' },
      },
    }).values
  } catch (error) {
    throw new OptionError(error instanceof Error ? error.message : String(error))
  }
}

const Secrets = z.object({ benchTokens: z.record(z.string(), z.string()).optional() })

/** The token is a secret: from the environment or from the file of secrets, never from the command line. */
function benchToken(bench: string, env: NodeJS.ProcessEnv): string {
  if (env.EVENSTRUNG_BENCH_TOKEN) return env.EVENSTRUNG_BENCH_TOKEN
  const file = path.join(env.DATA_DIR ?? '.data', 'secrets.json')
  let token: string | undefined
  try {
    token = Secrets.parse(JSON.parse(readFileSync(file, 'utf8'))).benchTokens?.[bench]
  } catch {
    throw new OptionError(
      `There is no token for bench ${bench}: set EVENSTRUNG_BENCH_TOKEN, or DATA_DIR to the folder of secrets.json.`,
    )
  }
  if (token === undefined) {
    throw new OptionError(
      `${file} holds no token for bench ${bench}: enrol it, or set EVENSTRUNG_BENCH_TOKEN.`,
    )
  }
  return token
}

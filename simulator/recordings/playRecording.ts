import { randomUUID } from 'node:crypto'
import { setTimeout as after } from 'node:timers/promises'
import type { RunView } from '../../src/shared/contract/runs.ts'
import type { BenchView } from '../../src/shared/contract/workshop.ts'
import { createBenchClient } from '../bench/benchClient.ts'
import { RecordingError } from '../signal/recordingError.ts'
import type { BenchSource } from '../sources/source.ts'
import type { ApiClient } from './apiClient.ts'

export interface PlayOptions {
  url: string
  /** of the bench that the recording plays on */
  token: string
  /** its name or its code */
  bench: string
  serial: string
  source: BenchSource
  log: (line: string) => void
}

const LOOK_AGAIN_MS = 200
/** Nothing new for so long: something hangs. */
const PATIENCE_MS = 60_000

/**
 * Plays a recording as a bench into a run of a serial, over the same doors as any bench and any person, and waits
 * until the run is stored.
 */
export async function playRecording(api: ApiClient, options: PlayOptions): Promise<RunView> {
  const { log, source, url, token } = options
  await acknowledgeCautions(api, log)
  const { items: models } = await api.call('models.list')
  const model = models.find(({ isRecording }) => isRecording)
  if (!model) throw new RecordingError('There is no model for recordings on this server.')
  const client = createBenchClient({ url, token, source, log: (line) => log(`bench: ${line}`) })
  client.start()
  try {
    const bench = await until(
      async () => await benchOf(api, options.bench),
      ({ connected, verified }) => connected && (verified || !source.verifySelf),
      'The bench does not get connected: is another program using its token?',
    )
    const id = randomUUID()
    await api.call('runs.start', {
      body: {
        id,
        serial: options.serial,
        modelId: model.id,
        benchId: bench.id,
        reason: 'recording',
        conditions: CONDITIONS,
      },
    })
    return await until(
      async () => await api.call('runs.read', { params: { id } }),
      ({ status, storage }) => status !== 'open' && storage === 'stored',
      'The run does not come to its end.',
      ({ measured, storage }) => `${measured.frames} ${storage}`,
    )
  } finally {
    client.stop()
    await source.close?.()
  }
}

const CONDITIONS = {
  stringSet: 'as recorded',
  strungMinutes: null,
  tunedToPitch: true,
  humidityPercent: null,
  temperatureC: null,
  controlsSet: true,
  excitation: 'hand',
  mute: 'hand',
}

async function acknowledgeCautions(api: ApiClient, log: (line: string) => void): Promise<void> {
  const { acknowledged } = await api.call('cautions.read')
  if (acknowledged) return
  await api.call('cautions.acknowledge', { body: { id: randomUUID() } })
  log(
    'The cautions count as read for this shift: a recording harms nobody. Read them before you use a bench.',
  )
}

async function benchOf(api: ApiClient, name: string): Promise<BenchView> {
  const wanted = name.toLowerCase()
  const { items } = await api.call('benches.list')
  const bench = items.find((each) => [each.name, each.code].some((text) => text.toLowerCase() === wanted))
  if (!bench) throw new RecordingError(`There is no bench ${name} on this server.`)
  return bench
}

/** Looks again and again until it is as wanted; gives up when nothing has changed for a minute. */
async function until<T>(
  look: () => Promise<T>,
  isDone: (value: T) => boolean,
  tooLong: string,
  progressOf: (value: T) => string = () => '',
): Promise<T> {
  let since = Date.now()
  let before = ''
  for (;;) {
    const value = await look()
    if (isDone(value)) return value
    const progress = progressOf(value)
    if (progress !== before) since = Date.now()
    before = progress
    if (Date.now() - since > PATIENCE_MS) throw new RecordingError(tooLong)
    await after(LOOK_AGAIN_MS)
  }
}

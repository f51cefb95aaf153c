import type { Capability } from '../../src/shared/contract/rules.ts'
import type { ChannelKind, FrameMs } from '../../src/shared/contract/frames.ts'
import { RecordingError } from '../signal/recordingError.ts'
import { SIGNAL_ALGORITHMS } from '../signal/signalAnalyser.ts'

/** What a recording and a stream of samples have in common as a bench. */
export interface RecordedSignalOptions {
  frameMs?: FrameMs
  mainsHz?: 50 | 60
  /** dBV minus mathematical rms dBFS, for all channels or one for each that is used */
  offsetDb?: number | readonly number[]
  /** which channels are the elements 1 to 6, or the jack; 1 is the first; left out: all of them */
  useChannels?: readonly number[]
  /** true: one frame for every frame length of time */
  realTime?: boolean
}

export interface RecordedSignal {
  channelKind: ChannelKind
  frameMs: FrameMs
  mainsHz: 50 | 60
  offsetDb: number[]
  /** index of each used channel in the samples */
  channels: number[]
  capabilities: Capability[]
  algorithms: Record<string, string>
}

/** Settles the options against the channels that are there; refuses what is neither six elements nor a jack. */
export function recordedSignal(
  source: string,
  channelsThere: number,
  rateHz: number,
  options: RecordedSignalOptions,
): RecordedSignal {
  const used = options.useChannels ?? Array.from({ length: channelsThere }, (_, i) => i + 1)
  for (const channel of used)
    if (!Number.isInteger(channel) || channel < 1 || channel > channelsThere)
      throw new RecordingError(`There is no channel ${channel}: the recording has ${channelsThere}.`)
  if (used.length !== 1 && used.length !== 6)
    throw new RecordingError(
      `The recording has ${used.length} channels. Six (one for each element) or one (the jack) can be ` +
        'measured; name the channels to use.',
    )
  const { offsetDb = 0 } = options
  const offsets = typeof offsetDb === 'number' ? used.map(() => offsetDb) : [...offsetDb]
  if (offsets.length !== used.length || !offsets.every(Number.isFinite))
    throw new RecordingError(`Give one offset in dB, or ${used.length} of them, one for each channel.`)
  return {
    channelKind: used.length === 6 ? 'six' : 'one',
    frameMs: options.frameMs ?? 10,
    mainsHz: options.mainsHz ?? 50,
    offsetDb: offsets,
    channels: used.map((channel) => channel - 1),
    capabilities: [used.length === 6 ? 'sixLevels' : 'jackLevel', 'noiseA', 'hum', 'pitch'],
    algorithms: { ...SIGNAL_ALGORITHMS, source, rate: `${rateHz} Hz`, offset: offsetText(offsets) },
  }
}

/** Fits the 40 characters that an entry may have. */
function offsetText(offsetDb: readonly number[]): string {
  const short = (value: number) => String(Number(value.toFixed(2)))
  if (offsetDb.every((value) => value === offsetDb[0])) return `${Number(offsetDb[0]!.toFixed(4))} dB`
  return offsetDb.map(short).join(' ').slice(0, 40)
}

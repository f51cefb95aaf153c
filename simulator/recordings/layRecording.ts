import type { StringNo } from '../../src/shared/contract/quantities.ts'
import { RECORDING_RATE_HZ } from './soxPlucks.ts'

/** One pluck laid into a recording. */
export interface LaidPluck {
  stringNo: StringNo
  atS: number
  gainDb: number
  /** how long it sounds before the hand damps it */
  soundsS: number
  /** dB that it stands lower on the other elements; left out: not there at all */
  crosstalkDb?: number
  /** the element gives nothing: only the crosstalk is heard */
  dead?: boolean
}

/** A hand on the strings: they are quiet within this time. */
const DAMPING_S = 0.03

/**
 * Lays plucks over noise. `noise` holds one array a channel and is not changed; six channels are the elements,
 * string 1 first, one channel hears every string.
 */
export function layRecording(
  noise: readonly Float64Array[],
  plucks: readonly LaidPluck[],
  sampleOf: (stringNo: StringNo) => Float64Array,
): Float64Array[] {
  const channels = noise.map((samples) => samples.slice())
  for (const pluck of plucks)
    channels.forEach((channel, index) => {
      const gainDb = gainOn(index, channels.length, pluck)
      if (gainDb !== null) lay(channel, pluck, sampleOf(pluck.stringNo), 10 ** (gainDb / 20))
    })
  return channels
}

function gainOn(index: number, channels: number, pluck: LaidPluck): number | null {
  const own = channels === 1 || index === pluck.stringNo - 1
  if (own) return pluck.dead ? null : pluck.gainDb
  return pluck.crosstalkDb === undefined ? null : pluck.gainDb - pluck.crosstalkDb
}

function lay(channel: Float64Array, { atS, soundsS }: LaidPluck, pluck: Float64Array, gain: number): void {
  const at = Math.round(atS * RECORDING_RATE_HZ)
  const sounding = Math.round(soundsS * RECORDING_RATE_HZ)
  const fading = Math.round(DAMPING_S * RECORDING_RATE_HZ)
  const count = Math.min(sounding + fading, pluck.length, channel.length - at)
  for (let i = 0; i < count; i++) {
    const damped = i < sounding ? 1 : 0.5 * (1 + Math.cos((Math.PI * (i - sounding)) / fading))
    channel[at + i] = channel[at + i]! + pluck[i]! * gain * damped
  }
}

import { bilinear, chebyshevLowPass } from './biquad.ts'
import type { Biquad } from './biquad.ts'

/** Second-order Butterworth: 0.07 dB down at 20 Hz; takes off a converter's offset and the thump of a hand. */
const LOW_CORNER_HZ = 7
/** Chebyshev, ripple 0.05 dB: flat to 20 kHz where the rate would carry far more. */
const HIGH_CORNER_HZ = 21_000
const HIGH_RIPPLE_DB = 0.05
const HIGH_ORDER = 8
/** At 44.1 and 48 kHz half the rate bounds the band by itself. */
const NEEDS_HIGH_CORNER_HZ = 50_000

/** Filter that bounds a 'broadband' level to about 20 Hz to 20 kHz, within 0.1 dB inside. */
export function measuringBand(rateHz: number): Biquad[] {
  const w = 2 * Math.PI * LOW_CORNER_HZ
  const low = bilinear([1, 0, 0], [1, Math.SQRT2 * w, w * w], rateHz)
  return rateHz > NEEDS_HIGH_CORNER_HZ
    ? [low, ...chebyshevLowPass(HIGH_CORNER_HZ, HIGH_ORDER, HIGH_RIPPLE_DB, rateHz)]
    : [low]
}

import { CENSOR_DB } from './constants.ts'

/**
 * dB to take off a level that holds noise of the same channel: K = -10 lg(1 - 10^(-0.1 d)), d = level - noise
 * (ISO 3744, background noise correction). Two stated departures: the correction is used at every d >= 6 dB, with
 * no step to zero at 15 dB, and below 6 dB there is none (null: the level is only 'at most noise + 6 dB').
 * In: dB above the noise; +Infinity gives 0, NaN gives null.
 *
 * @example noiseCorrectionDb(10) // 0.457...
 */
export function noiseCorrectionDb(aboveNoiseDb: number): number | null {
  if (!(aboveNoiseDb >= CENSOR_DB)) return null
  // -0 for no noise at all would show as '-0'
  return Math.abs(10 * Math.log10(1 - Math.pow(10, -0.1 * aboveNoiseDb)))
}

import { LEVEL_STEP_DB } from './constants.ts'
import type { PooledSd } from './pooledSd.ts'
import type { UncertaintyPart } from './welchSatterthwaite.ts'

export interface LevelUncertaintyInput {
  /** standard deviation of one pluck, dB, and its degrees of freedom */
  scatter: PooledSd
  /** accepted plucks */
  n: number
  /** calibration that only this channel has, and that all channels share, dB */
  uCalOwnDb: number
  uCalSharedDb: number
  frameMs: number
  /** how fast the string falls in the window, dB/s */
  decayDbPerS: number
}

/**
 * Parts of the uncertainty of a string's level: u^2 = s_p^2/n + u_cal^2 + u_res^2 + u_start^2. u_res is the step that
 * levels travel in / sqrt 12; u_start, the onset's place in its frame, is frame / sqrt 12 x decay rate (rectangular,
 * JCGM 100, 4.3.7). `own` are independent from channel to channel, `shared` is what all channels have in common: it
 * stays in a level and cancels in a balance. dB. No plucks give an infinite part, which no reading shows.
 */
export function levelUncertainty(input: LevelUncertaintyInput): {
  scatter: UncertaintyPart
  own: UncertaintyPart
  /** the part of `own` that is not calibration */
  start: UncertaintyPart
  shared: UncertaintyPart
} {
  const uRes = LEVEL_STEP_DB / Math.sqrt(12)
  const uStart = (input.frameMs / 1000 / Math.sqrt(12)) * Math.abs(input.decayDbPerS)
  return {
    scatter: { u: input.scatter.sd / Math.sqrt(input.n), dof: input.scatter.dof },
    own: { u: Math.hypot(input.uCalOwnDb, uRes, uStart), dof: null },
    start: { u: Math.hypot(uRes, uStart), dof: null },
    shared: { u: input.uCalSharedDb, dof: null },
  }
}

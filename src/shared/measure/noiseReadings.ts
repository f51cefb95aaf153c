import { SILENCE_MDB, NOT_MEASURED_MDB } from '../contract/quantities.ts'
import { LEVEL_STEP_DB } from './constants.ts'
import { NOTHING, type Evaluated, type EvaluatedRun } from './evaluateRun.ts'
import { dbOfPower } from './meanPowerDb.ts'
import { noiseAt, type PointNoise } from './noiseStretch.ts'
import { channelOf, type RunState } from './state.ts'
import type { UncertaintyPart } from './welchSatterthwaite.ts'

/** Noise, hum and S/N of a run, and where the noise was read: 0 = jack, 1..6 = that element, the loudest. */
export interface NoiseReadings {
  at: number | null
  flat: Evaluated
  a: Evaluated
  hum: Evaluated
  snFlat: Evaluated
  snA: Evaluated
}

/** Works out noise floor, hum and worst S/N. Everything is 'no reading' before the muted stretch is found. */
export function readNoise(state: RunState, evaluated: EvaluatedRun): NoiseReadings {
  const at = noisePoint(state)
  return {
    at,
    flat: at === null ? NOTHING : floorAt(state, at, 'flat'),
    a: at === null ? NOTHING : floorAt(state, at, 'a'),
    hum: readHum(state, at),
    snFlat: worstSignalToNoise(state, evaluated, 'flat'),
    snA: worstSignalToNoise(state, evaluated, 'a'),
  }
}

/** The jack where it is measured, else the loudest element. */
function noisePoint(state: RunState): number | null {
  if (state.noise === null) return null
  if (noiseAt(state.noise, 'jack', 'flat') !== null || state.plan.channels === 1) return 0
  let loudest: number | null = null
  let loudestDb = -Infinity
  for (let channel = 0; channel < state.plan.channels; channel++) {
    const noise = noiseAt(state.noise, { channel }, 'flat')
    const levelDb = noise === null ? NaN : dbOfPower(noise.power) + state.plan.calibrationDb[channel]!
    if (levelDb > loudestDb || (loudest === null && noise !== null)) {
      loudest = channel + 1
      loudestDb = levelDb
    }
  }
  return loudest
}

function pointNoise(state: RunState, at: number, weighting: 'flat' | 'a'): PointNoise | null {
  if (state.noise === null) return null
  if (at > 0) return noiseAt(state.noise, { channel: at - 1 }, weighting)
  const jack = noiseAt(state.noise, 'jack', weighting)
  // a one-channel bench reads the jack as its only channel
  return jack === null && state.plan.channels === 1 ? noiseAt(state.noise, { channel: 0 }, weighting) : jack
}

/** Calibration of a point: a one-channel bench's channel is the jack; a six-channel bench's jack has none of its own. */
function offsetAt(state: RunState, at: number): number {
  if (at > 0) return state.plan.calibrationDb[at - 1]!
  return state.plan.channels === 1 ? state.plan.calibrationDb[0]! : 0
}

/** The bench's own floor at a point, dBV: nothing below it can be told from silence. */
function benchFloorAt(state: RunState, at: number): number {
  const { floorDb } = state.setup
  if (at > 0) return floorDb[at - 1] ?? -Infinity
  return floorDb.length === 0 ? -Infinity : Math.max(...floorDb)
}

function floorAt(state: RunState, at: number, weighting: 'flat' | 'a'): Evaluated {
  const noise = pointNoise(state, at, weighting)
  if (noise === null) return NOTHING
  const levelDb = dbOfPower(noise.power) + offsetAt(state, at)
  const benchFloorDb = benchFloorAt(state, at)
  const parts: UncertaintyPart[] = calibrationParts(state)
  // flat only: how far down the bench reads A-weighted is not verified, so only silence is bounded there
  const hidden = weighting === 'flat' ? !(levelDb > benchFloorDb) : noise.power === 0
  if (hidden) return bound(benchFloorDb, noise.frames)
  return { value: levelDb, atMost: false, n: noise.frames, parts: [...parts, { u: noise.uDb, dof: null }] }
}

function bound(levelDb: number, n: number): Evaluated {
  return Number.isFinite(levelDb) ? { value: levelDb, atMost: true, n, parts: [] } : NOTHING
}

function calibrationParts(state: RunState): UncertaintyPart[] {
  const { uCalOwnDb, uCalSharedDb } = state.setup
  return [uCalOwnDb, uCalSharedDb, LEVEL_STEP_DB / Math.sqrt(12)].map((u) => ({ u, dof: null }))
}

/** Hum at the point of the noise floor, as the bench reports it over the quiet stretch; else of the loudest element. */
function readHum(state: RunState, at: number | null): Evaluated {
  if (at === null) return NOTHING
  const candidates = state.hum[at] ? [at] : [0, 1, 2, 3, 4, 5, 6].filter((channel) => state.hum[channel])
  let worst: Evaluated = NOTHING
  for (const channel of candidates) {
    const { levelMdb } = state.hum[channel]!
    if (levelMdb === NOT_MEASURED_MDB) continue
    const levelDb = levelMdb / 1000 + offsetAt(state, channel)
    const reading: Evaluated =
      levelMdb === SILENCE_MDB
        ? bound(benchFloorAt(state, channel), 1)
        : { value: levelDb, atMost: false, n: 1, parts: calibrationParts(state) }
    if (reading.value !== null && (worst.value === null || reading.value > worst.value)) worst = reading
  }
  return worst
}

/**
 * Worst S/N of the six: level before the noise is taken off minus the noise of the same channel, both flat or both
 * A, so that both come from the same point. A silent string has at most what its bound leaves. No reading unless
 * every string has one.
 */
function worstSignalToNoise(state: RunState, evaluated: EvaluatedRun, weighting: 'flat' | 'a'): Evaluated {
  let worst: Evaluated = NOTHING
  for (const string of evaluated.strings) {
    const reading = signalToNoise(state, string, weighting)
    if (reading.value === null) return NOTHING
    if (worst.value === null || reading.value < worst.value) worst = reading
  }
  return worst
}

function signalToNoise(
  state: RunState,
  string: EvaluatedRun['strings'][number],
  weighting: 'flat' | 'a',
): Evaluated {
  const channel = channelOf(state, string.tally.stringNo)
  const noise = state.noise === null ? null : noiseAt(state.noise, { channel }, weighting)
  if (noise === null) return NOTHING
  const offsetDb = state.plan.calibrationDb[channel]!
  // silence is read as the bench's own floor, which makes the S/N too small, never too large
  const noiseDb = noise.power === 0 ? benchFloorAt(state, channel + 1) : dbOfPower(noise.power) + offsetDb
  if (!Number.isFinite(noiseDb)) return NOTHING
  if (string.level.atMost) {
    return weighting === 'flat' ? bound(string.level.value! - state.floorDb[channel]!, 0) : NOTHING
  }
  const signalDb = weighting === 'flat' ? string.rawDb : string.rawADb
  if (signalDb === null) return NOTHING
  return { value: signalDb - noiseDb, atMost: false, n: string.level.n, parts: ratioParts(string, noise) }
}

/** Calibration is the same in both terms and cancels; scatter, start and the noise's own unsteadiness stay. */
function ratioParts(string: EvaluatedRun['strings'][number], noise: PointNoise): UncertaintyPart[] {
  if (string.independent === null) return []
  return [string.independent.scatter, string.independent.start, { u: noise.uDb, dof: null }]
}

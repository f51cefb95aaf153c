import { NOT_MEASURED_MDB, STRING_NOS } from '../contract/quantities.ts'
import type { BenchEvent } from '../contract/frames.ts'
import type { MeasuredRun, RunPhase, Verdict } from '../contract/measured.ts'
import type { RunSetup } from '../contract/runs.ts'
import { createJackWatch, type JackWatch } from './jackWatch.ts'
import { createLevelRing, type LevelRing } from './levelRing.ts'
import { dbOfPower } from './meanPowerDb.ts'
import { createNoiseStretch, noiseAt, type NoiseStretch, type NoiseSums } from './noiseStretch.ts'
import { createOnsetWatch, type OnsetWatch } from './onsetWatch.ts'
import { createPitchLog, type PitchLog } from './pitchLog.ts'
import { planRun, type RunPlan } from './runPlan.ts'
import { createSettleWatch, type SettleWatch } from './settleWatch.ts'
import { createStringTally, type MeasuredPluck, type StringTally } from './stringTally.ts'

/** A pluck whose window is not over yet. */
export interface PluckUnderWay {
  onsetFrame: number
  /** it is a rise on a string that still rang, not a 10 dB onset */
  onRinging: boolean
  /** frame in which something was excited again while the window was open */
  secondOnsetFrame: number | null
  /** each channel's own floor before it, thousandths of a dBV as it came */
  ownFloorMdb: number[]
}

export type HumEvent = Extract<BenchEvent, { kind: 'hum' }>

/** Everything that a run has come to; a pure function of set-up, frames, events and actions. */
export interface RunState {
  readonly setup: RunSetup
  readonly plan: RunPlan
  frames: number
  /** increases whenever something that a screen shows has changed */
  changes: number
  phase: RunPhase
  phaseFromFrame: number
  progressTenths: number
  ring: LevelRing
  onsets: OnsetWatch
  pitches: PitchLog
  settle: SettleWatch
  stretch: NoiseStretch
  noise: NoiseSums | null
  /** the quiet stretch that hum reports must lie in, frames [from, to) */
  quietFrames: { from: number; to: number }
  /** hum reports by channel, 0 = jack, latest inside the quiet stretch */
  hum: (HumEvent | null)[]
  /** hum reports that came while the stretch was still being looked for */
  humWaiting: HumEvent[]
  /** noise floor of each channel, dBV, not below the bench's own; known once the noise is */
  floorDb: number[]
  /** the same before calibration, thousandths of a dBV */
  mutedFloorMdb: number[]
  strings: StringTally[]
  plucks: MeasuredPluck[]
  pluck: PluckUnderWay | null
  jack: JackWatch
  plugged: boolean | null
  /** before this frame nothing is a pluck: the plug was out and the preamp settles anew */
  plucksFromFrame: number
  person: string
  entered: MeasuredRun['entered']
  verdict: Verdict | null
  /** increases whenever a string's plucks, its state or a floor changed: what levels are worked out from */
  levelChanges: number
}

export function createState(setup: RunSetup): RunState {
  const plan = planRun(setup)
  return {
    setup,
    plan,
    frames: 0,
    changes: 1,
    phase: plan.phases[0]!,
    phaseFromFrame: 0,
    progressTenths: 0,
    ring: createLevelRing(plan.channels),
    onsets: createOnsetWatch(setup.frameMs, plan.rawFloorMdb),
    pitches: createPitchLog(),
    settle: createSettleWatch(plan.channels, setup.frameMs),
    stretch: createNoiseStretch(plan.channels, setup.frameMs, plan.noiseStretchMs),
    noise: null,
    quietFrames: { from: 0, to: 0 },
    hum: Array.from({ length: 7 }, () => null),
    humWaiting: [],
    floorDb: plan.rawFloorMdb.map((mdb, i) => mdb / 1000 + plan.calibrationDb[i]!),
    mutedFloorMdb: plan.rawFloorMdb.slice(),
    strings: STRING_NOS.map((stringNo) => createStringTally(stringNo, plan)),
    plucks: [],
    pluck: null,
    jack: createJackWatch(),
    plugged: null,
    plucksFromFrame: 0,
    person: setup.person,
    entered: [],
    verdict: null,
    levelChanges: 0,
  }
}

/** The run takes no more frames or actions. */
export function isFinished(state: RunState): boolean {
  return state.phase === 'done' || state.phase === 'stopped'
}

/** Place of a string's level in a frame: its own element, or the jack. */
export function channelOf(state: RunState, stringNo: number): number {
  return state.plan.channels === 1 ? 0 : stringNo - 1
}

/** The string that is asked for: the first that needs a pluck, from bass to treble; null when none does. */
export function askedString(state: RunState): StringTally | null {
  for (let i = state.strings.length - 1; i >= 0; i--) {
    if (state.strings[i]!.state === 'todo') return state.strings[i]!
  }
  return null
}

/** Keeps a noise stretch as the run's, and with it every channel's floor, not below the bench's own. */
export function keepNoise(state: RunState, sums: NoiseSums): void {
  const { plan } = state
  state.noise = sums
  state.levelChanges++
  for (let channel = 0; channel < plan.channels; channel++) {
    const noise = noiseAt(sums, { channel }, 'flat')
    const rawMdb = noise === null ? NaN : dbOfPower(noise.power) * 1000
    const floorMdb = rawMdb > plan.rawFloorMdb[channel]! ? rawMdb : plan.rawFloorMdb[channel]!
    state.mutedFloorMdb[channel] = floorMdb
    state.floorDb[channel] = floorMdb / 1000 + plan.calibrationDb[channel]!
  }
}

/** Level as it came, in dBV with the channel's calibration; silence is -Infinity, not measured NaN. */
export function dbvOf(state: RunState, channel: number, mdb: number): number {
  if (mdb === NOT_MEASURED_MDB) return NaN
  return mdb / 1000 + state.plan.calibrationDb[channel]!
}

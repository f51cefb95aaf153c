import { ATTACK_POWER, ATTACK_TAU_S, PARTIAL_COUNT, PARTIAL_POWER, PARTIAL_TAU } from './partials.ts'
import type { StringParts } from './instrument.ts'

/** Time constant of a hand laid on the string, s. */
const DAMPED_TAU_S = 0.02
/** A string whose power fell so far below its start is taken as still. */
const STILL_RATIO = 1e-14
/** Both polarisations of each group of partials. */
const MODES = 2 * PARTIAL_COUNT

export interface PluckForce {
  /** power of the pluck against a normal one, 1 = as always */
  power: number
  /** power of the attack's click against a normal one */
  attackPower: number
}

/** One ringing string. Powers are means over the present frame; the second frame's are kept ready. */
export interface Voice {
  /** the fast polarisation's groups, then the slow one's */
  modes: Float64Array
  second: Float64Array | null
  step: Float64Array
  attack: number
  secondAttack: number
  attackStep: number
  startPower: number
}

/** Mean over a frame of a power 1 that starts restS before its end and falls with the amplitude constant tau. */
export function meanOfFall(tauS: number, restS: number, frameS: number): number {
  return ((tauS / 2) * (1 - Math.exp((-2 * restS) / tauS))) / frameS
}

/** A pluck that starts at `intoFrame` (0..1) of a frame: the first frame holds only the part after it. */
export function makeVoice(string: StringParts, force: PluckForce, frameS: number, intoFrame: number): Voice {
  const startPower = string.startV * string.startV * force.power
  const restS = (1 - intoFrame) * frameS
  const modes = new Float64Array(MODES)
  const second = new Float64Array(MODES)
  const step = new Float64Array(MODES)
  for (let mode = 0; mode < MODES; mode++) {
    const group = mode % PARTIAL_COUNT
    const isFast = mode < PARTIAL_COUNT
    const tauS = (isFast ? string.fastTauS : string.slowTauS) * PARTIAL_TAU[group]!
    const share = isFast ? string.fastShare : 1 - string.fastShare
    const power = startPower * PARTIAL_POWER[group]! * share
    modes[mode] = power * meanOfFall(tauS, restS, frameS)
    second[mode] = power * Math.exp((-2 * restS) / tauS) * meanOfFall(tauS, frameS, frameS)
    step[mode] = Math.exp((-2 * frameS) / tauS)
  }
  const click = startPower * ATTACK_POWER * force.attackPower
  return {
    modes,
    second,
    step,
    attack: click * meanOfFall(ATTACK_TAU_S, restS, frameS),
    secondAttack: click * Math.exp((-2 * restS) / ATTACK_TAU_S) * meanOfFall(ATTACK_TAU_S, frameS, frameS),
    attackStep: Math.exp((-2 * frameS) / ATTACK_TAU_S),
    startPower,
  }
}

/** Moves a voice on by one frame; false: the string is still. */
export function advanceVoice(voice: Voice): boolean {
  if (voice.second) {
    voice.modes = voice.second
    voice.attack = voice.secondAttack
    voice.second = null
    return true
  }
  let sum = 0
  const { modes, step } = voice
  for (let mode = 0; mode < MODES; mode++) {
    modes[mode]! *= step[mode]!
    sum += modes[mode]!
  }
  voice.attack *= voice.attackStep
  return sum > voice.startPower * STILL_RATIO
}

/** A hand on the string: every partial dies within hundredths of a second. */
export function dampVoice(voice: Voice, frameS: number): void {
  voice.step.fill(Math.exp((-2 * frameS) / DAMPED_TAU_S))
}

/** Power of a voice through paths of so much power gain for each group of partials. */
export function powerThrough(voice: Voice, gains: Float64Array): number {
  let sum = 0
  const { modes } = voice
  for (let group = 0; group < PARTIAL_COUNT; group++) {
    sum += (modes[group]! + modes[group + PARTIAL_COUNT]!) * gains[group]!
  }
  return sum
}

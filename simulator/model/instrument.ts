import type { Model } from '../../src/shared/contract/thresholds.ts'
import { makeRandom } from './random.ts'
import type { Random } from './random.ts'

export type Circuit = Model['circuit']

/** One piezo element: a voltage source behind a capacitor. */
export interface ElementParts {
  capacitanceF: number
  /** voltage for the same pressing force, 1 = as designed */
  sensitivity: number
  /** share of the string's force that presses the element, 1 = beds well */
  seating: number
  polarity: 1 | -1
  state: 'sound' | 'open' | 'shorted'
  /** leakage across the element */
  leakOhm: number
  /** capacitance from the room's mains wiring to its hot lead: what its shield lets through */
  fieldCouplingF: number
}

/** One string (or course) as the saddle feels it: two polarisations that die at different rates. */
export interface StringParts {
  /** element voltage at the start of a normal pluck, V rms, the attack left out */
  startV: number
  /** amplitude time constants of the two polarisations' fundamental, s */
  fastTauS: number
  slowTauS: number
  /** share of the starting power that the fast polarisation holds */
  fastShare: number
}

export interface PreampParts {
  /** bias resistance at an input (parallel: at the one input) */
  biasOhm: number
  /** a wrong load across the input; infinite = none */
  loadOhm: number
  /** capacitance of a lead and the input */
  leadF: number
  gain: number
  voltageNoise: number
  /** below this frequency 1/f noise leads */
  flickerHz: number
  currentNoise: number
  /** noise of the output stage behind the volume control, V per root Hz */
  outputNoise: number
  /** gain of the volume control, 1 = full */
  volume: number
  /** what the output stage needs from each rail, V */
  railDropV: number
  /** below this supply voltage it does not work */
  leastSupplyV: number
  quiescentA: number
}

export interface SupplyParts {
  /** voltage without load */
  batteryV: number
  batteryOhm: number
  /** capacity that is left, ampere seconds */
  chargeAs: number
  connected: boolean
  /** something that draws current beside the preamp */
  leakOhm: number
}

export const POLES = ['tip', 'ring', 'sleeve'] as const
export type Pole = (typeof POLES)[number]

export interface JackParts {
  contactOhm: Record<Pole, number>
  tipOpen: boolean
  /** ring to sleeve: closes when plugged, or sticks */
  switchState: 'works' | 'stuckClosed' | 'stuckOpen'
  /** breaks a second while the plug is moved, all poles together */
  breaksPerSecond: number
  /** median length of a break, s */
  breakS: number
  insulationOhm: number
  /** voltage of the thump of plugging in, and its time constant */
  thumpV: number
  thumpTauS: number
}

/** The mains field around the instrument: amplitude of each harmonic (index 0 = mains frequency), V rms. */
export interface RoomParts {
  temperatureK: number
  fieldV: number[]
}

export interface CrackleParts {
  perSecond: number
  /** charge that a typical burst moves at an input, coulomb rms: the node's capacitance makes a voltage of it */
  burstC: number
  /** the element whose input crackles (buffered circuit), 0 = element 1 */
  element: number
}

export interface InstrumentParts {
  seed: number
  circuit: Circuit
  /** string 1 (treble E) first */
  elements: ElementParts[]
  strings: StringParts[]
  /** which element the lead of channel 1..6 comes from (index of the element) */
  leads: number[]
  /** amplitude with which element e hears string s, its own left out: crosstalk[s][e] */
  crosstalk: number[][]
  preamp: PreampParts
  supply: SupplyParts
  jack: JackParts
  room: RoomParts
  crackle: CrackleParts
  /** mains harmonics that a loop puts in series with the bench's own inputs, V rms */
  benchLoopV: number[]
}

/**
 * Starting voltages of the six elements, from memory: similar force on all six strings, plain strings a little
 * hotter than wound ones beside them, the bass E left a little hot.
 */
const START_MV = [74, 80, 84, 80, 78, 82]
/** Amplitude time constants in the middle of the range that is told for steel strings, from memory. */
const TAU_S = [0.55, 0.7, 1.15, 1.35, 2.0, 2.3]
const FAST_TAU = 0.75
const SLOW_TAU = 1.25
const PICOFARAD = 1e-12

/** Rough size of the room's mains harmonics against the fundamental; common practice, no source. */
const ROOM_HARMONICS = [1, 0.1, 0.25, 0.05, 0.14, 0.03, 0.08, 0.02, 0.05, 0.02]
const ROOM_MAINS_V = 50
/** A shielded lead lets so little through that healthy hum stays under the hiss. */
export const SHIELDED_COUPLING_F = 2.5e-17

/** A sound instrument of the model, with the small differences between one and the next that the seed makes. */
export function makeInstrument(seed: number, circuit: Circuit): InstrumentParts {
  const random = makeRandom(seed, 'instrument')
  const parallel = circuit === 'parallel'
  const preampDb = random.normalWithin(2.5) * 0.25
  return {
    seed,
    circuit,
    elements: START_MV.map(() => ({
      capacitanceF: 500 * PICOFARAD * (1 + 0.03 * random.normalWithin(2.5)),
      sensitivity: ratioOfDb(0.4 * random.normalWithin(2.5)),
      seating: ratioOfDb(0.3 * random.normalWithin(2.5)),
      polarity: 1,
      state: 'sound',
      leakOhm: Number.POSITIVE_INFINITY,
      fieldCouplingF: SHIELDED_COUPLING_F * ratioOfDb(2 * random.normalWithin(2.5)),
    })),
    strings: START_MV.map((millivolt, i) => {
      const tau = TAU_S[i]! * (1 + 0.08 * random.normalWithin(2.5))
      return {
        startV: millivolt / 1000,
        fastTauS: tau * FAST_TAU,
        slowTauS: tau * SLOW_TAU,
        fastShare: 0.5 + 0.06 * random.normalWithin(2.5),
      }
    }),
    leads: [0, 1, 2, 3, 4, 5],
    crosstalk: START_MV.map((_, s) => START_MV.map((__, e) => crosstalkRatio(s, e, random))),
    preamp: {
      biasOhm: 10e6,
      loadOhm: Number.POSITIVE_INFINITY,
      leadF: (parallel ? 40 : 30) * PICOFARAD,
      gain: ratioOfDb((parallel ? 20 : 4.9) + preampDb),
      voltageNoise: 30e-9 * ratioOfDb(0.6 * random.normalWithin(2.5)),
      flickerHz: 60,
      currentNoise: 8e-15,
      outputNoise: 12e-9,
      volume: 1,
      railDropV: 1.5,
      leastSupplyV: 3.2,
      quiescentA: 0.0012 * (1 + 0.06 * random.normalWithin(2.5)),
    },
    supply: {
      batteryV: 9.35 + 0.08 * random.normalWithin(2.5),
      batteryOhm: 4 + 2 * random.uniform(),
      chargeAs: 0.55 * 3600,
      connected: true,
      leakOhm: 200e6,
    },
    jack: {
      contactOhm: {
        tip: 0.008 + 0.015 * random.uniform(),
        ring: 0.008 + 0.015 * random.uniform(),
        sleeve: 0.006 + 0.012 * random.uniform(),
      },
      tipOpen: false,
      switchState: 'works',
      breaksPerSecond: 0,
      breakS: 0.002,
      insulationOhm: 400e6 * (1 + random.uniform()),
      thumpV: 0.3 + 0.3 * random.uniform(),
      thumpTauS: 0.3 + 0.1 * random.uniform(),
    },
    room: { temperatureK: 296, fieldV: ROOM_HARMONICS.map((share) => share * ROOM_MAINS_V) },
    crackle: { perSecond: 0, burstC: 0, element: 0 },
    benchLoopV: [],
  }
}

/** Neighbours hear a string at about -21.5 dB, the others at -24 dB, always within -25..-15 dB. */
function crosstalkRatio(stringIndex: number, elementIndex: number, random: Random): number {
  const distance = Math.abs(stringIndex - elementIndex)
  if (distance === 0) return 1
  const levelDb = (distance === 1 ? -21.5 : -24) + random.normalWithin(2)
  return ratioOfDb(Math.min(-15, Math.max(-25, levelDb)))
}

/** Amplitude ratio of a difference in dB. */
export function ratioOfDb(db: number): number {
  return Math.pow(10, db / 20)
}

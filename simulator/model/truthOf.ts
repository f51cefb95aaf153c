import type { ChannelKind } from '../../src/shared/contract/frames.ts'
import { balanceDb, referenceOf } from '../../src/shared/measure/balanceDb.ts'
import { benchLoop } from './benchInput.ts'
import { compileCircuit, JACK } from './circuit.ts'
import type { CompiledCircuit, Tuning } from './circuit.ts'
import { STANDARD_TUNING } from './circuit.ts'
import { POLES } from './instrument.ts'
import type { InstrumentParts, Pole } from './instrument.ts'
import { clipPeakV, loadedSupply, switchCloses } from './jackState.ts'
import { advanceVoice, makeVoice, powerThrough } from './voices.ts'
import type { Voice } from './voices.ts'

const FRAME_S = 0.01
const WINDOW_FROM_FRAME = 5
const WINDOW_FRAMES = 20

/** What a perfect bench and a perfect hand would read of an instrument: no noise in it, no scatter. */
export interface Truth {
  /** level of string 1..6 in the window 50..250 ms after its onset, at its own channel, dBV; null: nothing comes */
  levelDb: (number | null)[]
  /** the same at the output jack */
  jackLevelDb: (number | null)[]
  /** level minus the mean of those within 6 dB of the median, no pattern taken off, at the bench's channels, dB */
  balanceDb: (number | null)[]
  /** level of the loudest other element while string 1..6 is plucked, dBV (six-channel) */
  loudestOtherDb: (number | null)[]
  /** noise of the instrument with its hum, without the bench's own: channel 1..6, then the jack, dBV */
  noiseFlatDb: (number | null)[]
  noiseADb: (number | null)[]
  /** mains lines up to 1 kHz at channel 1..6 and the jack, dBV */
  humDb: (number | null)[]
  /** highest rms that a sine keeps at the output, dBV */
  clipLevelDb: number | null
  switchOpenUnplugged: boolean
  switchClosedPlugged: boolean
  tipClosed: boolean
  contactOhm: Record<Pole, number>
  insulationOhm: number
  breaksPerSecond: number
  currentPluggedMa: number
  currentUnpluggedUa: number
  batteryV: number
  powered: boolean
}

/** Reads the truth off the parts: the same circuit and the same strings, without noise and without scatter. */
export function truthOf(
  parts: InstrumentParts,
  channelKind: ChannelKind = 'six',
  tuning: Tuning = STANDARD_TUNING,
  mainsHz: 50 | 60 = 50,
): Truth {
  const circuit = compileCircuit(parts, tuning, mainsHz, FRAME_S)
  const loaded = loadedSupply(parts)
  const closed = switchCloses(parts, true)
  const powered = closed && loaded.batteryV >= parts.preamp.leastSupplyV
  const windows = parts.strings.map((_, s) => windowPowers(parts, circuit, s))
  const levelAt = (s: number, point: number): number | null => (powered ? dbOf(windows[s]![point]!) : null)
  const levelDb = windows.map((_, s) => levelAt(s, s))
  const jackLevelDb = windows.map((_, s) => (parts.jack.tipOpen ? null : levelAt(s, JACK)))
  const judged = channelKind === 'six' ? levelDb : jackLevelDb
  const { referenceDb } = referenceOf(judged.map((each) => ({ levelDb: each, atMost: false })))
  const clipV = clipPeakV(parts, loaded.batteryV) / Math.SQRT2
  const reaches = (point: number): boolean => powered && !(point === JACK && parts.jack.tipOpen)
  const loop = benchLoop(parts.benchLoopV, mainsHz)
  return {
    levelDb,
    jackLevelDb,
    balanceDb: judged.map((each) => balanceDb(each, referenceDb, 0)),
    loudestOtherDb: windows.map((powers, s) =>
      powered ? dbOf(Math.max(...powers.slice(0, JACK).filter((_, point) => point !== s))) : null,
    ),
    noiseFlatDb: circuit.noise.map((noise, point) =>
      dbOf(reaches(point) ? noise.flatPower + circuit.mains[point]!.flat + loop.flat : loop.flat),
    ),
    noiseADb: circuit.noise.map((noise, point) =>
      dbOf(reaches(point) ? noise.aPower + circuit.mains[point]!.a + loop.a : loop.a),
    ),
    humDb: circuit.mains.map((mains, point) => dbOf((reaches(point) ? mains.hum : 0) + loop.hum)),
    clipLevelDb: powered && clipV > 0 ? 20 * Math.log10(clipV) : null,
    switchOpenUnplugged: !switchCloses(parts, false),
    switchClosedPlugged: closed,
    tipClosed: !parts.jack.tipOpen,
    contactOhm: contactsOf(parts),
    insulationOhm: parts.jack.insulationOhm,
    breaksPerSecond: parts.jack.breaksPerSecond,
    currentPluggedMa: closed ? loaded.currentA * 1000 : 0,
    currentUnpluggedUa: switchCloses(parts, false) ? loaded.currentA * 1e6 : 0,
    batteryV: loaded.batteryV,
    powered,
  }
}

/** Mean power of one string's normal pluck in the window, at every point. */
function windowPowers(parts: InstrumentParts, circuit: CompiledCircuit, stringIndex: number): number[] {
  const voice = makeVoice(parts.strings[stringIndex]!, { power: 1, attackPower: 1 }, FRAME_S, 0)
  const paths = circuit.strings[stringIndex]!
  const sums = paths.flat.map(() => 0)
  for (let frame = 0; frame < WINDOW_FROM_FRAME + WINDOW_FRAMES; frame++) {
    if (frame >= WINDOW_FROM_FRAME) {
      paths.flat.forEach((gains, point) => {
        sums[point]! += powerAt(voice, gains, paths.attack[point]!) / WINDOW_FRAMES
      })
    }
    advanceVoice(voice)
  }
  return sums
}

function powerAt(voice: Voice, gains: Float64Array, attackGain: number): number {
  return powerThrough(voice, gains) + voice.attack * attackGain
}

function contactsOf(parts: InstrumentParts): Record<Pole, number> {
  const entries = POLES.map((pole) => {
    const open = pole === 'tip' && parts.jack.tipOpen
    return [pole, open ? Number.POSITIVE_INFINITY : parts.jack.contactOhm[pole]] as const
  })
  return Object.fromEntries(entries) as Record<Pole, number>
}

function dbOf(power: number): number | null {
  return power > 0 ? 10 * Math.log10(power) : null
}

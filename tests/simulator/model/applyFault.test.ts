import { describe, expect, it } from 'vitest'
import { FaultId } from '../../../src/shared/contract/simulation.ts'
import { applyFault, applyFaults, stringOfFault } from '../../../simulator/model/applyFault.ts'
import { makeInstrument } from '../../../simulator/model/instrument.ts'
import type { Circuit } from '../../../simulator/model/instrument.ts'
import { truthOf } from '../../../simulator/model/truthOf.ts'
import type { Truth } from '../../../simulator/model/truthOf.ts'

const JACK = 6
const FAULTY_STRING = 3

type Mark =
  | 'speaks'
  | 'balance'
  | 'meanLevel'
  | 'jackBalance'
  | 'jackLevel'
  | 'noiseFlat'
  | 'noiseA'
  | 'hum'
  | 'clipLevel'
  | 'switchOpen'
  | 'switchClosed'
  | 'tip'
  | 'contacts'
  | 'breaks'
  | 'currentPlugged'
  | 'currentUnplugged'
  | 'battery'

type Levels = readonly (number | null)[]

function meanOf(levels: Levels): number {
  const known = levels.filter((level) => level !== null)
  return known.reduce((sum, level) => sum + level, 0) / known.length
}

function moved(before: Levels, after: Levels, limit: number): boolean {
  return before.some((level, i) => {
    const other = after[i]!
    return level !== null && other !== null && Math.abs(other - level) > limit
  })
}

function lost(before: Levels, after: Levels): boolean {
  return before.some((level, i) => (level === null) !== (after[i] === null))
}

/** String against string, each against the mean, so that a common change does not show. */
function against(levels: Levels): Levels {
  const mean = meanOf(levels)
  return levels.map((level) => (level === null ? null : level - mean))
}

/** The readings in which two truths differ by more than a bench would overlook. */
function differences(before: Truth, after: Truth): Mark[] {
  const scalar = (a: number | null, b: number | null, limit: number): boolean =>
    (a === null) !== (b === null) || (a !== null && b !== null && Math.abs(a - b) > limit)
  const marks: [Mark, boolean][] = [
    ['speaks', lost(before.levelDb, after.levelDb)],
    ['balance', moved(against(before.levelDb), against(after.levelDb), 1)],
    ['meanLevel', Math.abs(meanOf(after.levelDb) - meanOf(before.levelDb)) > 1],
    ['jackBalance', moved(against(before.jackLevelDb), against(after.jackLevelDb), 1)],
    [
      'jackLevel',
      lost(before.jackLevelDb, after.jackLevelDb) || moved(before.jackLevelDb, after.jackLevelDb, 0.8),
    ],
    ['noiseFlat', scalar(before.noiseFlatDb[JACK]!, after.noiseFlatDb[JACK]!, 1.5)],
    ['noiseA', scalar(before.noiseADb[JACK]!, after.noiseADb[JACK]!, 1.5)],
    ['hum', scalar(before.humDb[JACK]!, after.humDb[JACK]!, 3)],
    ['clipLevel', scalar(before.clipLevelDb, after.clipLevelDb, 0.5)],
    ['switchOpen', before.switchOpenUnplugged !== after.switchOpenUnplugged],
    ['switchClosed', before.switchClosedPlugged !== after.switchClosedPlugged],
    ['tip', before.tipClosed !== after.tipClosed],
    ['contacts', scalar(before.contactOhm.tip, after.contactOhm.tip, 0.02)],
    ['breaks', before.breaksPerSecond !== after.breaksPerSecond],
    ['currentPlugged', scalar(before.currentPluggedMa, after.currentPluggedMa, 0.3)],
    ['currentUnplugged', scalar(before.currentUnpluggedUa, after.currentUnpluggedUa, 1)],
    ['battery', scalar(before.batteryV, after.batteryV, 0.3)],
  ]
  return marks.filter(([, differs]) => differs).map(([mark]) => mark)
}

function marksOf(fault: FaultId, circuit: Circuit, stringNo: number | undefined = FAULTY_STRING): Mark[] {
  const sound = makeInstrument(11, circuit)
  const faulty = applyFaults(makeInstrument(11, circuit), [{ fault, severity: 1, stringNo }])
  return differences(truthOf(sound), truthOf(faulty))
}

const DEAD: Mark[] = ['speaks', 'jackLevel', 'noiseFlat', 'noiseA', 'hum', 'clipLevel']
const SADDLE: Mark[] = ['balance', 'jackBalance', 'jackLevel']

/** Where each fault must show at a buffered instrument, and by being a full list: where it must not. */
const BUFFERED: Record<FaultId, Mark[]> = {
  // the other five stay; the open input hisses
  elementOpen: ['speaks', 'jackBalance', 'jackLevel', 'noiseFlat', 'noiseA'],
  elementShorted: ['speaks', 'jackBalance', 'jackLevel'],
  poorSeating: SADDLE,
  endsTight: [...SADDLE, 'meanLevel'],
  hollowMiddle: [...SADDLE, 'meanLevel'],
  tiltedSaddle: SADDLE,
  stripEndLump: [...SADDLE, 'meanLevel'],
  // the sum at the jack does not care which lead is which
  crossedLeads: ['balance', 'meanLevel'],
  // each alone is fine; only the sum tells
  polarityFlipped: ['jackBalance', 'jackLevel'],
  // thin bass, and hum with it
  inputLoading: [...SADDLE, 'meanLevel', 'noiseFlat', 'hum'],
  // silent, with the hiss of a working preamp whose inputs are held at ground: less of the low thermal noise
  stripShorted: ['speaks', 'jackLevel', 'noiseFlat', 'hum'],
  noPower: [...DEAD, 'currentPlugged', 'battery'],
  volumeDown: ['meanLevel', 'jackLevel', 'noiseFlat', 'noiseA', 'hum', 'clipLevel'],
  lowBattery: ['clipLevel', 'battery'],
  shieldOpen: ['noiseFlat', 'noiseA', 'hum'],
  dimmerBuzz: ['noiseFlat', 'noiseA', 'hum'],
  hissyPreamp: ['noiseFlat', 'noiseA'],
  // bursts come and go: the stream shows them, see the modelled bench
  crackle: [],
  wornJack: ['contacts', 'breaks'],
  switchStuckClosed: ['switchOpen', 'currentUnplugged'],
  switchStuckOpen: [...DEAD, 'switchClosed', 'currentPlugged'],
  currentHigh: ['currentPlugged'],
  tipOpen: ['jackLevel', 'noiseFlat', 'noiseA', 'hum', 'tip', 'contacts'],
  benchHum: ['noiseFlat', 'noiseA', 'hum'],
}

describe('applyFault()', () => {
  it.each(FaultId.options)('%s shows in its own readings and in no other (buffered)', (fault) => {
    expect(new Set(marksOf(fault, 'buffered'))).toEqual(new Set(BUFFERED[fault]))
  })

  it('an open element of a parallel strip raises the other five by 1.6 dB, at the elements and at the jack', () => {
    const sound = truthOf(makeInstrument(11, 'parallel'))
    const faulty = truthOf(
      applyFaults(makeInstrument(11, 'parallel'), [{ fault: 'elementOpen', severity: 1, stringNo: 3 }]),
    )
    expect(faulty.levelDb[2]).toBeNull()
    for (const s of [0, 1, 3, 4, 5]) expect(faulty.levelDb[s]! - sound.levelDb[s]!).toBeCloseTo(1.6, 0)
    // strings far from the dead one lose none of its crosstalk
    for (const s of [0, 5]) expect(faulty.jackLevelDb[s]! - sound.jackLevelDb[s]!).toBeCloseTo(1.6, 0)
    expect(faulty.jackLevelDb[2]! - sound.jackLevelDb[2]!).toBeLessThan(-13)
  })

  it('a shorted element silences all six of a parallel strip but not its preamp', () => {
    const faulty = truthOf(
      applyFaults(makeInstrument(11, 'parallel'), [{ fault: 'elementShorted', severity: 1, stringNo: 3 }]),
    )
    expect(faulty.levelDb).toEqual([null, null, null, null, null, null])
    expect(faulty.noiseFlatDb[JACK]).toBeGreaterThan(-95)
    expect(faulty.currentPluggedMa).toBeGreaterThan(0.8)
  })

  it('a loaded input takes more from the bass than from the treble', () => {
    const sound = truthOf(makeInstrument(11, 'buffered'))
    const faulty = truthOf(
      applyFaults(makeInstrument(11, 'buffered'), [{ fault: 'inputLoading', severity: 1 }]),
    )
    const loss = sound.levelDb.map((level, s) => level! - faulty.levelDb[s]!)
    expect(loss[5]!).toBeGreaterThan(loss[0]! + 3)
  })

  it('a flipped element is weak in the sum and takes from its neighbours', () => {
    const sound = truthOf(makeInstrument(11, 'parallel'))
    const faulty = truthOf(
      applyFaults(makeInstrument(11, 'parallel'), [{ fault: 'polarityFlipped', severity: 1, stringNo: 3 }]),
    )
    const change = sound.jackLevelDb.map((level, s) => faulty.jackLevelDb[s]! - level!)
    expect(change[2]).toBeLessThan(-1)
    expect(change[1]).toBeLessThan(-0.4)
    expect(change[3]).toBeLessThan(-0.4)
    expect(change[5]).toBeCloseTo(0, 6)
    expect(faulty.levelDb).toEqual(sound.levelDb)
  })

  it.each(['poorSeating', 'endsTight', 'volumeDown', 'hissyPreamp', 'shieldOpen', 'currentHigh'] as const)(
    '%s grows with its severity',
    (fault) => {
      const at = (severity: number): Truth =>
        truthOf(applyFaults(makeInstrument(11, 'buffered'), [{ fault, severity, stringNo: 3 }]))
      const size = (truth: Truth): number => {
        const sound = truthOf(makeInstrument(11, 'buffered'))
        const levels = truth.levelDb.reduce<number>(
          (sum, level, s) => sum + Math.abs(level! - sound.levelDb[s]!),
          0,
        )
        return levels + Math.abs(truth.noiseFlatDb[JACK]! - sound.noiseFlatDb[JACK]!) + truth.currentPluggedMa
      }
      const sizes = [0, 1, 2, 3].map((severity) => size(at(severity)))
      expect(sizes[1]).toBeGreaterThan(sizes[0]!)
      expect(sizes[2]).toBeGreaterThan(sizes[1]!)
      expect(sizes[3]).toBeGreaterThan(sizes[2]!)
    },
  )

  it('two faults lie one over the other', () => {
    const parts = makeInstrument(11, 'buffered')
    applyFault(parts, { fault: 'poorSeating', severity: 1, stringNo: 2 })
    applyFault(parts, { fault: 'currentHigh', severity: 1 })
    const marks = differences(truthOf(makeInstrument(11, 'buffered')), truthOf(parts))
    expect(marks).toContain('balance')
    expect(marks).toContain('currentPlugged')
  })
})

describe('stringOfFault()', () => {
  it('is the string that was told, else one that the seed chooses and keeps', () => {
    const parts = makeInstrument(11, 'buffered')
    expect(stringOfFault(parts, { fault: 'elementOpen', severity: 1, stringNo: 5 })).toBe(5)
    const chosen = stringOfFault(parts, { fault: 'elementOpen', severity: 1 })
    expect(stringOfFault(makeInstrument(11, 'parallel'), { fault: 'elementOpen', severity: 1 })).toBe(chosen)
    expect(chosen).toBeGreaterThanOrEqual(1)
    expect(chosen).toBeLessThanOrEqual(6)
    expect(stringOfFault(parts, { fault: 'stripEndLump', severity: 1 })).toBe(1)
  })
})

import { describe, expect, it } from 'vitest'
import { makeInstrument } from '../../../simulator/model/instrument.ts'
import type { StringParts } from '../../../simulator/model/instrument.ts'
import { PARTIAL_COUNT } from '../../../simulator/model/partials.ts'
import {
  advanceVoice,
  dampVoice,
  makeVoice,
  meanOfFall,
  powerThrough,
} from '../../../simulator/model/voices.ts'

const FRAME_S = 0.01
const ONLY_FUNDAMENTAL = Float64Array.from({ length: PARTIAL_COUNT }, (_, g) => (g === 0 ? 1 : 0))
const ALL = new Float64Array(PARTIAL_COUNT).fill(1)
const NORMAL = { power: 1, attackPower: 1 }

/** Frame powers of a pluck at the start of a frame. */
function powersOf(string: StringParts, gains: Float64Array, frames: number, into = 0): number[] {
  const voice = makeVoice(string, NORMAL, FRAME_S, into)
  return Array.from({ length: frames }, () => {
    const power = powerThrough(voice, gains)
    advanceVoice(voice)
    return power
  })
}

function oneSlope(tauS: number): StringParts {
  return { startV: 1, fastTauS: tauS, slowTauS: tauS, fastShare: 0.5 }
}

function levelDb(powers: number[], fromFrame: number, toFrame: number): number {
  const part = powers.slice(fromFrame, toFrame)
  return 10 * Math.log10(part.reduce((sum, power) => sum + power, 0) / part.length)
}

describe('makeVoice()', () => {
  // window 0.05-0.25 s against no decay: -4.0 dB at tau 0.3 s, -0.4 dB at tau 3 s (textbook arithmetic)
  it.each([
    [0.3, -4.0],
    [3, -0.4],
  ])('with one slope of %d s loses %d dB in the window', (tauS, lossDb) => {
    const powers = powersOf(oneSlope(tauS), ONLY_FUNDAMENTAL, 25)
    const start = makeVoice(oneSlope(1e9), NORMAL, FRAME_S, 0)
    expect(levelDb(powers, 5, 25) - 10 * Math.log10(powerThrough(start, ONLY_FUNDAMENTAL))).toBeCloseTo(
      lossDb,
      1,
    )
  })

  // amplitude constant 1.5-3 s: 3-6 dB/s for strings 5 and 6; 4-11 for 3 and 4; 9-29 for 1 and 2 (from memory)
  it.each([
    [1, 9, 29],
    [2, 9, 29],
    [3, 4, 11],
    [4, 4, 11],
    [5, 3, 6],
    [6, 3, 6],
  ])('string %d falls %d to %d dB/s over its first second', (stringNo, low, high) => {
    for (let seed = 1; seed <= 20; seed++) {
      const powers = powersOf(makeInstrument(seed, 'buffered').strings[stringNo - 1]!, ONLY_FUNDAMENTAL, 110)
      const fallDb = levelDb(powers, 5, 15) - levelDb(powers, 95, 105)
      expect(fallDb / 0.9).toBeGreaterThan(low)
      expect(fallDb / 0.9).toBeLessThan(high)
    }
  })

  it('falls faster at first than later: two polarisations and higher partials', () => {
    const powers = powersOf(makeInstrument(1, 'buffered').strings[2]!, ALL, 300)
    const early = levelDb(powers, 0, 20) - levelDb(powers, 40, 60)
    const late = levelDb(powers, 200, 220) - levelDb(powers, 240, 260)
    expect(early).toBeGreaterThan(late)
  })

  it('holds in its first frame only the part after the pluck', () => {
    const whole = powersOf(oneSlope(5), ALL, 1)[0]!
    const half = powersOf(oneSlope(5), ALL, 1, 0.5)[0]!
    expect(half / whole).toBeCloseTo(0.5, 2)
  })

  it('is the same decay wherever in the frame it starts', () => {
    const string = makeInstrument(1, 'buffered').strings[5]!
    const sum = (into: number): number =>
      powersOf(string, ALL, 400, into).reduce((total, power) => total + power, 0)
    expect(sum(0.37) / sum(0)).toBeCloseTo(1, 2)
  })

  it('has an attack 16 to 21 dB above the sustain that is gone when the window begins', () => {
    const string = makeInstrument(1, 'buffered').strings[5]!
    const voice = makeVoice(string, NORMAL, 0.001, 0)
    const attackDb = 10 * Math.log10(voice.attack / voice.startPower)
    // peak of the attack over the rms of the sustain; the attack's crest adds 3 to 6 dB
    expect(attackDb + 6.5).toBeGreaterThan(16)
    expect(attackDb + 6.5).toBeLessThan(21)
    for (let ms = 0; ms < 50; ms++) advanceVoice(voice)
    expect(voice.attack / powerThrough(voice, ALL)).toBeLessThan(0.001)
  })
})

describe('dampVoice()', () => {
  it('silences a string within a fifth of a second', () => {
    const voice = makeVoice(oneSlope(2), NORMAL, FRAME_S, 0)
    dampVoice(voice, FRAME_S)
    for (let frame = 0; frame < 21; frame++) advanceVoice(voice)
    expect(10 * Math.log10(powerThrough(voice, ALL))).toBeLessThan(-75)
  })
})

describe('advanceVoice()', () => {
  it('tells when the string is still', () => {
    const voice = makeVoice(oneSlope(0.02), NORMAL, FRAME_S, 0)
    let frames = 0
    while (advanceVoice(voice)) frames += 1
    expect(frames).toBeGreaterThan(10)
    expect(frames).toBeLessThan(100)
  })
})

describe('meanOfFall()', () => {
  it('of a constant is the share of the frame', () => {
    expect(meanOfFall(1e9, 0.004, 0.01)).toBeCloseTo(0.4, 5)
  })
})

import { describe, expect, it } from 'vitest'
import { findPitches } from '../../../simulator/signal/pitch.ts'
import { rmsOf, sine, stringTone, sumOf, whiteNoise } from '../../helpers/signals.ts'
import type { StringTone } from '../../helpers/signals.ts'

/** Equal temperament from A4 = 440 Hz (ISO 16). */
const hzOf = (midi: number) => 440 * 2 ** ((midi - 69) / 12)
const MIDI = [64, 59, 55, 50, 45, 40]
const SIX = MIDI.map((midi) => [hzOf(midi)])
const TWELVE = MIDI.map((midi, i) => (i < 2 ? [hzOf(midi)] : [hzOf(midi), hzOf(midi + 12)]))
const RATE = 48_000
const LENGTH = 0.21 * RATE

const cents = (hz: number, wanted: number) => 1200 * Math.log2(hz / wanted)
const noisy = (samples: Float64Array, snrDb: number, seed = 1) =>
  sumOf(samples, whiteNoise(samples.length, rmsOf(samples) * 10 ** (-snrDb / 20), seed))
const tone = (hz: number, more: Partial<StringTone> = {}, rateHz = RATE) =>
  stringTone(Math.round(0.21 * rateHz), rateHz, { hz, ...more })

/** First-order high-pass: 15 dB down at 82 Hz for a corner of 480 Hz, as an input that loads the element. */
function highPassed(samples: Float64Array, cornerHz: number): Float64Array {
  const a = Math.exp((-2 * Math.PI * cornerHz) / RATE)
  let low = 0
  return samples.map((x) => {
    low = a * low + (1 - a) * x
    return x - low
  })
}

describe('findPitches() of one string', () => {
  it.each([44_100, 48_000, 96_000])(
    'tells every semitone from D2 to G4 at %i Hz in noise 40 dB below',
    (rate) => {
      for (let midi = 38; midi <= 67; midi++) {
        const found = findPitches(noisy(tone(hzOf(midi), {}, rate), 40), rate, SIX)
        expect(found).toHaveLength(1)
        expect(Math.abs(cents(found[0]!.hz, hzOf(midi)))).toBeLessThan(10)
        expect(found[0]!.confidence).toBeGreaterThan(0.9)
      }
    },
  )

  it.each([0.05, 0.1, 0.2, 0.25, 1 / 3, 0.5])(
    'makes no octave error wherever it is plucked (%d)',
    (pluckedAt) => {
      for (const midi of MIDI)
        for (const tauS of [0.1, 0.3, 3]) {
          const found = findPitches(noisy(tone(hzOf(midi), { pluckedAt, tauS }), 40), RATE, SIX)
          expect(found.map(({ hz }) => Math.round(cents(hz, hzOf(midi)) / 20))).toEqual([0])
        }
    },
  )

  it('still tells stiff strings and a bass whose fundamental a thin input has taken 15 dB down', () => {
    for (const midi of MIDI) {
      const stiff = findPitches(tone(hzOf(midi), { stiffness: 3e-4 }), RATE, SIX)
      expect(stiff.map(({ hz }) => Math.abs(cents(hz, hzOf(midi))) < 30)).toEqual([true])
    }
    const thin = highPassed(tone(82.407), 480)
    expect(findPitches(thin, RATE, SIX).map(({ hz }) => Math.round(hz))).toEqual([82])
  })

  it('reports a string that is a whole tone off as what it is, whatever is expected', () => {
    for (const midi of MIDI)
      for (const off of [-2, -1, -0.6, 0.6, 1, 2]) {
        const found = findPitches(noisy(tone(hzOf(midi + off)), 40), RATE, SIX)
        expect(found).toHaveLength(1)
        expect(Math.abs(cents(found[0]!.hz, hzOf(midi + off)))).toBeLessThan(10)
      }
  })

  it('reports a pitch in noise only 10 dB below, and none in noise alone or in nothing', () => {
    for (const midi of MIDI)
      expect(findPitches(noisy(tone(hzOf(midi)), 10), RATE, SIX).map(({ hz }) => Math.round(hz))).toEqual([
        Math.round(hzOf(midi)),
      ])
    for (let seed = 1; seed <= 20; seed++)
      expect(findPitches(whiteNoise(LENGTH, 0.1, seed), RATE, SIX)).toEqual([])
    expect(findPitches(new Float64Array(LENGTH), RATE, SIX)).toEqual([])
  })

  it('tells a pitch from 60 ms as well', () => {
    for (const midi of MIDI) {
      const found = findPitches(tone(hzOf(midi)).subarray(0, 0.06 * RATE), RATE, SIX)
      expect(found.map(({ hz }) => Math.abs(cents(hz, hzOf(midi))) < 50)).toEqual([true])
    }
  })

  it('does not take hum 30 dB below for a string', () => {
    const hum = sumOf(...[50, 100, 150, 250].map((hz) => sine(LENGTH, hz, RATE, 0.0015)))
    for (const midi of MIDI) {
      const found = findPitches(sumOf(tone(hzOf(midi)), hum), RATE, SIX)
      expect(found.map(({ hz }) => Math.round(cents(hz, hzOf(midi)) / 20))).toEqual([0])
    }
  })
})

describe('findPitches() of two strings', () => {
  /** Whole multiples within 1 cent: told apart only where each string has a channel of its own. */
  const FALL_TOGETHER = ['40+59', '40+64', '45+64']
  const pairs = MIDI.flatMap((a) => MIDI.filter((b) => b > a).map((b) => [a, b] as const)).filter(
    ([a, b]) => !FALL_TOGETHER.includes(`${a}+${b}`),
  )

  it.each(pairs)('tells strings %i and %i (MIDI) struck together, up to 12 dB apart', (a, b) => {
    for (const gain of [0.25, 0.5, 1, 2, 4]) {
      const both = sumOf(tone(hzOf(a)), tone(hzOf(b), { peak: 0.1 * gain, pluckedAt: 0.17 }))
      const found = findPitches(noisy(both, 40), RATE, SIX).map(({ hz }) => hz)
      expect(found).toHaveLength(2)
      for (const midi of [a, b])
        expect(Math.min(...found.map((hz) => Math.abs(cents(hz, hzOf(midi)))))).toBeLessThan(25)
    }
  })

  it('never gives one pitch that is not there for strings whose partials fall together', () => {
    for (const [a, b] of [
      [40, 59],
      [40, 64],
      [45, 64],
    ] as const) {
      const found = findPitches(sumOf(tone(hzOf(a)), tone(hzOf(b))), RATE, SIX).map(({ hz }) => hz)
      for (const hz of found)
        expect(Math.min(...[a, b].map((midi) => Math.abs(cents(hz, hzOf(midi)))))).toBeLessThan(25)
    }
  })

  it('reports two pitches for a strum over all six', () => {
    const all = sumOf(...MIDI.map((midi) => tone(hzOf(midi))))
    expect(findPitches(all, RATE, SIX)).toHaveLength(2)
  })

  it('tells both, the loud one first, where a lower string whose partials fall together rings 12 dB below', () => {
    const both = sumOf(tone(hzOf(59)), tone(hzOf(40), { peak: 0.025 }))
    expect(findPitches(both, RATE, SIX).map(({ hz }) => Math.round(hz))).toEqual([247, 82])
  })

  it('does not report a string that only rings along 20 dB below', () => {
    for (const midi of MIDI.slice(1)) {
      const along = sumOf(tone(hzOf(midi)), tone(hzOf(40), { peak: 0.01 }))
      expect(findPitches(along, RATE, SIX).map(({ hz }) => Math.round(hz))).toEqual([Math.round(hzOf(midi))])
    }
  })
})

describe('findPitches() of a course in octaves', () => {
  it.each([55, 50, 45, 40])('tells both strings of the course on %i (MIDI)', (midi) => {
    const both = sumOf(tone(hzOf(midi)), tone(hzOf(midi + 12), { pluckedAt: 0.11 }))
    const found = findPitches(noisy(both, 40), RATE, TWELVE).map(({ hz }) => Math.round(hz))
    expect(found).toEqual([Math.round(hzOf(midi)), Math.round(hzOf(midi + 12))])
  })

  it('reports the octave string alone when the other one is silent, and does not invent it when it is', () => {
    for (const midi of [55, 50, 45, 40]) {
      const octave = findPitches(tone(hzOf(midi + 12)), RATE, TWELVE)
      expect(octave.map(({ hz }) => Math.round(hz))).toEqual([Math.round(hzOf(midi + 12))])
      const low = findPitches(tone(hzOf(midi)), RATE, TWELVE)
      expect(low.map(({ hz }) => Math.round(hz))).toEqual([Math.round(hzOf(midi))])
    }
  })
})

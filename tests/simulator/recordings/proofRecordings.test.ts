import { describe, expect, it } from 'vitest'
import type { PitchEvent } from '../../../src/shared/contract/frames.ts'
import { STRING_NOS } from '../../../src/shared/contract/quantities.ts'
import { meanPowerDb } from '../../../src/shared/measure/meanPowerDb.ts'
import { KNOWN_GAINS_DB, SCATTER_DB } from '../../../simulator/recordings/proofRecordings.ts'
import { layRecording } from '../../../simulator/recordings/layRecording.ts'
import { OPEN_STRINGS_HZ, soxPluck } from '../../../simulator/recordings/soxPlucks.ts'
import { WavSource } from '../../../simulator/sources/wavSource.ts'
import { writeWav } from '../../../simulator/signal/writeWav.ts'
import { playAll, recordings } from '../../helpers/recordings.ts'
import type { Played } from '../../helpers/recordings.ts'
import { temporaryFolder } from '../../helpers/temporaryFolder.ts'

const proof = recordings()
const played = (kind: keyof typeof proof.file) => playAll(new WavSource(proof.file[kind]))
const pitchesIn = ({ events }: Played) =>
  events.filter((event): event is PitchEvent => event.kind === 'pitch')
const stringOf = ({ milliHz }: PitchEvent) =>
  STRING_NOS.find((no) => Math.abs(12 * Math.log2(milliHz / 1000 / OPEN_STRINGS_HZ[no - 1]!)) < 0.5)
/** Energy mean of the 20 frames from 50 to 250 ms after the frame in which the pluck begins, dB. */
const pluckLevelDb = ({ frames }: Played, atS: number, channel: number) => {
  const onset = Math.floor(atS * 100)
  return meanPowerDb(frames.slice(onset + 5, onset + 25).map((frame) => frame.levelMdb[channel]! / 1000))!
}
const sampleSd = (values: number[]) => {
  const mean = values.reduce((sum, x) => sum + x, 0) / values.length
  return Math.sqrt(values.reduce((sum, x) => sum + (x - mean) ** 2, 0) / (values.length - 1))
}

describe('the recordings of the first proof', () => {
  it('begin with 3 s of noise at -80 dBFS and nothing else', () => {
    for (const kind of ['sixChannels', 'oneChannel'] as const) {
      const { frames } = played(kind)
      const channels = frames[0]!.levelMdb.length
      for (let channel = 0; channel < channels; channel++) {
        const floorDb = meanPowerDb(frames.slice(10, 299).map((frame) => frame.levelMdb[channel]! / 1000))!
        expect(Math.abs(floorDb + 80)).toBeLessThan(0.1)
      }
    }
  })

  it('have known gains that a balance can be told from, and a scatter of exactly 1 dB', () => {
    expect(new Set(proof.expectedBalanceDb.map((db) => db.toFixed(1))).size).toBeGreaterThanOrEqual(5)
    expect(sampleSd([...SCATTER_DB])).toBe(1)
    expect(proof.expectedLevelDb).toHaveLength(KNOWN_GAINS_DB.length)
  })

  it.each([
    ['sixChannels', 6],
    ['oneChannel', 1],
  ] as const)(
    '%s: every string is named by its pitch within 300 ms, and nothing else is',
    (kind, channels) => {
      const play = played(kind)
      const pitches = pitchesIn(play)
      expect(pitches.map(stringOf)).toEqual(proof.plucks[kind].map(({ stringNo }) => stringNo))
      expect(pitches.map(({ channel }) => channel)).toEqual(
        proof.plucks[kind].map(({ stringNo }) => (channels === 6 ? stringNo : 0)),
      )
      pitches.forEach((pitch, i) => {
        const onsetTenthMs = proof.plucks[kind][i]!.atS * 10_000
        expect((pitch.frame + 1) * 100 - onsetTenthMs).toBeLessThan(3000)
        expect(pitch.startTenthMs).toBeGreaterThan(onsetTenthMs)
        expect(pitch.durationTenthMs).toBeGreaterThanOrEqual(600)
        expect(pitch.confidencePercent).toBeGreaterThan(90)
      })
      expect(play.events.at(-1)).toMatchObject({ kind: 'endOfSource', frame: play.frames.length - 1 })
    },
  )

  it.each(['sixChannels', 'oneChannel'] as const)('%s: frames give the balances that sox expects', (kind) => {
    const play = played(kind)
    const levels = STRING_NOS.map((no) => {
      const own = proof.plucks[kind].filter(({ stringNo }) => stringNo === no)
      return own.map(({ atS }) => pluckLevelDb(play, atS, kind === 'oneChannel' ? 0 : no - 1))
    })
    const means = levels.map((of) => of.reduce((sum, x) => sum + x, 0) / of.length)
    const all = means.reduce((sum, x) => sum + x, 0) / 6
    STRING_NOS.forEach((no) => {
      expect(Math.abs(means[no - 1]! - all - proof.expectedBalanceDb[no - 1]!)).toBeLessThan(0.1)
      expect(Math.abs(sampleSd(levels[no - 1]!) - 1)).toBeLessThan(0.1)
    })
  })

  it('has a level within 0.05 dB of sox where a pluck begins with its frame', () => {
    const folder = temporaryFolder()
    for (const stringNo of STRING_NOS) {
      const pluck = soxPluck(stringNo, folder)
      const laid = { stringNo, atS: 0.5, gainDb: 0, soundsS: 0.6 }
      const file = `${folder}/aligned-${stringNo}.wav`
      writeWav(
        file,
        layRecording([new Float64Array(96_000)], [laid], () => pluck.samples),
        48_000,
      )
      const level = pluckLevelDb(playAll(new WavSource(file)), 0.5, 0)
      expect(Math.abs(level - pluck.rmsLevDb)).toBeLessThan(0.05)
    }
  })
})

describe('the second set of recordings', () => {
  it('holds digital silence, in which nothing is heard', () => {
    const play = played('digitalSilence')
    expect(play.frames.flatMap((frame) => frame.levelMdb).every((level) => level === -1_000_000)).toBe(true)
    expect(pitchesIn(play)).toEqual([])
  })

  it('holds a string that clips, and only that string does', () => {
    const { frames } = played('clipping')
    const clippedIn = (atS: number) =>
      frames.slice(Math.floor(atS * 100), Math.floor(atS * 100) + 25).reduce((sum, f) => sum + f.clipped, 0)
    for (const { stringNo, atS } of proof.plucks.clipping)
      expect(clippedIn(atS) > 0, `string ${stringNo}`).toBe(stringNo === 3)
  })

  it('holds a string plucked again after 1 s while it rings', () => {
    const play = played('undampedRepluck')
    const [first, again] = proof.plucks.undampedRepluck.slice(-2)
    expect(again!.atS - first!.atS).toBeCloseTo(1, 9)
    const before = play.frames[Math.floor(again!.atS * 100) - 5]!.levelMdb[3]!
    expect(before).toBeGreaterThan(-60_000)
    expect(
      pitchesIn(play)
        .filter((p) => p.startTenthMs > again!.atS * 10_000)
        .map(stringOf),
    ).toContain(4)
  })

  it.each([
    ['strumSix', [4, 5]],
    ['strumOne', [0]],
  ] as const)('%s holds two strings at once, and both are reported', (kind, channels) => {
    const play = played(kind)
    const strums = proof.plucks[kind].filter(({ stringNo }) => stringNo === 5)
    expect(strums).toHaveLength(3)
    for (const { atS } of strums) {
      const heard = pitchesIn(play).filter((p) => Math.abs(p.startTenthMs / 1e4 - atS - 0.04) < 0.02)
      expect(new Set(heard.map(stringOf))).toEqual(new Set([4, 5]))
      expect(new Set(heard.map(({ channel }) => channel))).toEqual(new Set(channels))
    }
  })

  it('holds a dead string that the others hear by its pitch', () => {
    const play = played('deadString')
    const dead = proof.plucks.deadString.filter(({ stringNo }) => stringNo === 2)
    for (const { atS } of dead) {
      const heard = pitchesIn(play).filter((p) => Math.abs(p.startTenthMs / 1e4 - atS - 0.04) < 0.02)
      expect(heard.map(stringOf)).toEqual(heard.map(() => 2))
      expect(heard.map(({ channel }) => channel)).toEqual([1, 3, 4, 5, 6])
      expect(Math.abs(pluckLevelDb(play, atS, 1) + 80)).toBeLessThan(0.5)
    }
    expect(dead).toHaveLength(3)
  })
})

import { existsSync, mkdirSync, mkdtempSync, readFileSync, renameSync, rmSync, writeFileSync } from 'node:fs'
import path from 'node:path'
import { STRING_NOS } from '../../src/shared/contract/quantities.ts'
import type { StringNo } from '../../src/shared/contract/quantities.ts'
import { writeWav } from '../signal/writeWav.ts'
import { layRecording } from './layRecording.ts'
import type { LaidPluck } from './layRecording.ts'
import { RECORDING_RATE_HZ, soxPluck, soxWhiteNoise } from './soxPlucks.ts'
import type { SoxPluck } from './soxPlucks.ts'

/** Another number for another content, so that a cache never gives old recordings. */
const VERSION = 2
const NOISE_DBFS = -80
/** Noise alone at the beginning. */
const QUIET_S = 3
const SPACING_S = 1.25
const SOUNDS_S = 0.6
const TAIL_S = 1
/** Known gains of the strings, string 1 first, dB. */
export const KNOWN_GAINS_DB: readonly number[] = [1.2, -0.8, 0.4, -1.6, 2.0, -1.2]
/** The scatter of a hand, laid in: sample standard deviation 1.00 dB. */
export const SCATTER_DB: readonly number[] = [-1, 0, 1]
const EVERY_STRING = [...STRING_NOS].reverse()

export type RecordingKind =
  | 'sixChannels'
  | 'oneChannel'
  | 'digitalSilence'
  | 'clipping'
  | 'undampedRepluck'
  | 'strumSix'
  | 'strumOne'
  | 'deadString'

export interface ProofRecordings {
  file: Record<RecordingKind, string>
  /** what sox says of each string, plus its known gain, string 1 first, dB re full scale */
  expectedLevelDb: number[]
  /** each expected level less their mean */
  expectedBalanceDb: number[]
  plucks: Record<RecordingKind, LaidPluck[]>
}

/**
 * The recordings of the first proof, made by sox, and what must be measured in them. Made once in a folder, whole or
 * not at all, so that two that make it at once do not meet half a file.
 */
export function proofRecordings(cacheFolder: string): ProofRecordings {
  const folder = path.join(cacheFolder, `proof-${VERSION}`)
  if (!existsSync(folder)) {
    mkdirSync(cacheFolder, { recursive: true })
    const making = mkdtempSync(path.join(cacheFolder, 'making-'))
    makeAll(making)
    try {
      renameSync(making, folder)
    } catch (error) {
      rmSync(making, { recursive: true })
      if (!existsSync(folder)) throw error
    }
  }
  const levels = JSON.parse(readFileSync(path.join(folder, 'sox-levels.json'), 'utf8')) as number[]
  const expected = levels.map((level, i) => level + KNOWN_GAINS_DB[i]!)
  const mean = expected.reduce((sum, level) => sum + level, 0) / expected.length
  const plucks = laidPlucks()
  const file = Object.fromEntries(
    Object.keys(plucks).map((kind) => [kind, path.join(folder, `${kind}.wav`)]),
  ) as Record<RecordingKind, string>
  return { file, plucks, expectedLevelDb: expected, expectedBalanceDb: expected.map((level) => level - mean) }
}

function makeAll(folder: string): void {
  const sources = new Map<StringNo, SoxPluck>(STRING_NOS.map((no) => [no, soxPluck(no, folder)]))
  const sampleOf = (no: StringNo) => sources.get(no)!.samples
  const plucks = laidPlucks()
  const seconds = Math.max(...Object.values(plucks).map(lengthS))
  const noise = soxWhiteNoise(seconds * 6, NOISE_DBFS, folder)
  const each = Math.floor(noise.length / 6)
  const noiseOf = (channels: number, lengthSeconds: number) =>
    Array.from({ length: channels }, (_, c) =>
      noise.subarray(c * each, c * each + Math.round(lengthSeconds * RECORDING_RATE_HZ)),
    )
  for (const kind of Object.keys(plucks) as RecordingKind[]) {
    const channels = kind === 'oneChannel' || kind === 'strumOne' ? 1 : 6
    const bed = noiseOf(channels, lengthS(plucks[kind]))
    const silent = kind === 'digitalSilence' ? bed.map((samples) => new Float64Array(samples.length)) : bed
    writeWav(
      path.join(folder, `${kind}.wav`),
      layRecording(silent, plucks[kind], sampleOf),
      RECORDING_RATE_HZ,
    )
  }
  const levels = STRING_NOS.map((no) => sources.get(no)!.rmsLevDb)
  writeFileSync(path.join(folder, 'sox-levels.json'), JSON.stringify(levels))
}

function lengthS(plucks: readonly LaidPluck[]): number {
  return Math.max(QUIET_S, ...plucks.map((pluck) => pluck.atS + SPACING_S)) + TAIL_S
}

/** Three plucks of each string, bass first, each at another place within its frame. */
function evenHand(): LaidPluck[] {
  return EVERY_STRING.flatMap((stringNo, place) =>
    SCATTER_DB.map((scatterDb, i) => {
      const no = place * SCATTER_DB.length + i
      const offGridS = 0.001 + (no % 7) * 0.0011
      return {
        stringNo,
        atS: QUIET_S + no * SPACING_S + offGridS,
        gainDb: KNOWN_GAINS_DB[stringNo - 1]! + scatterDb,
        soundsS: SOUNDS_S,
      }
    }),
  )
}

function laidPlucks(): Record<RecordingKind, LaidPluck[]> {
  const even = evenHand()
  return {
    sixChannels: even,
    oneChannel: even,
    digitalSilence: [],
    // the strings peak 13 dB below full scale: 18 dB more is clipped by any measure
    clipping: even.map((pluck) => (pluck.stringNo === 3 ? { ...pluck, gainDb: pluck.gainDb + 18 } : pluck)),
    undampedRepluck: repluckUndamped(even),
    strumSix: strummed(even),
    strumOne: strummed(even),
    deadString: even.map((pluck) => ({ ...pluck, crosstalkDb: 20, dead: pluck.stringNo === 2 })),
  }
}

/** String 4 is plucked again after 1 s while it still sounds; what came before it is damped as ever. */
function repluckUndamped(even: readonly LaidPluck[]): LaidPluck[] {
  const own = even.filter((pluck) => pluck.stringNo === 4)
  const first = own[0]!
  return [
    ...even.filter((pluck) => pluck.atS < first.atS),
    { ...first, soundsS: 1.6 },
    { ...first, atS: first.atS + 1, gainDb: first.gainDb + 1 },
  ]
}

/** Strings 5 and 4 are struck together, three times, after string 6. */
function strummed(even: readonly LaidPluck[]): LaidPluck[] {
  const bass = even.filter((pluck) => pluck.stringNo === 6)
  const both = even
    .filter((pluck) => pluck.stringNo === 5)
    .flatMap((pluck) => [pluck, { ...pluck, stringNo: 4 as const, atS: pluck.atS + 0.004 }])
  return [...bass, ...both]
}

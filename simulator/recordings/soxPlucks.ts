import { execFileSync, spawnSync } from 'node:child_process'
import path from 'node:path'
import type { StringNo } from '../../src/shared/contract/quantities.ts'
import { RecordingError } from '../signal/recordingError.ts'
import { WavFile } from '../signal/wav.ts'

export const RECORDING_RATE_HZ = 48_000
/** The attenuation of each synthesised string, so that what is laid on top never clips by itself. */
const ATTENUATION_DB = 12
/** A sample spread evenly over +-1 has an rms of 1 / sqrt 3. */
const EVEN_SPREAD_DB = 10 * Math.log10(3)

/** Open strings E4 B3 G3 D3 A2 E2, equal temperament from A4 = 440 Hz (ISO 16), string 1 first. */
export const OPEN_STRINGS_HZ: readonly number[] = [64, 59, 55, 50, 45, 40].map(
  (midi) => 440 * 2 ** ((midi - 69) / 12),
)

/** One open string as sox makes it, and what sox itself says of its level. */
export interface SoxPluck {
  file: string
  samples: Float64Array
  /** `sox FILE -n trim 0.05 0.2 stats`, line 'RMS lev dB': mathematical rms re full scale, two decimals */
  rmsLevDb: number
}

export function hasSox(): boolean {
  return spawnSync('sox', ['--version']).status === 0
}

/** Two seconds of one open string, plucked once, 12 dB down, faded at its end. */
export function soxPluck(stringNo: StringNo, folder: string): SoxPluck {
  const file = path.join(folder, `string-${stringNo}.wav`)
  const hz = OPEN_STRINGS_HZ[stringNo - 1]!
  // The rate stands before -n: after it sox makes the tone at another rate and a resampler takes 3 dB off it.
  const make = ['-R', '-r', String(RECORDING_RATE_HZ), '-b', '24', '-n', file]
  sox([
    ...make,
    'synth',
    '2',
    'pluck',
    hz.toFixed(4),
    'vol',
    `-${ATTENUATION_DB}dB`,
    'fade',
    't',
    '0',
    '2',
    '0.1',
  ])
  return { file, samples: samplesOf(file), rmsLevDb: soxRmsLevDb(file) }
}

/** White noise whose rms stands at `rmsDbfs`, the same each time. */
export function soxWhiteNoise(seconds: number, rmsDbfs: number, folder: string): Float64Array {
  const file = path.join(folder, 'noise.wav')
  const make = ['-R', '-r', String(RECORDING_RATE_HZ), '-b', '24', '-n', file]
  sox([
    ...make,
    'synth',
    seconds.toFixed(4),
    'whitenoise',
    'vol',
    `${(rmsDbfs + EVEN_SPREAD_DB).toFixed(4)}dB`,
  ])
  return samplesOf(file)
}

/** The level that sox measures from 0.05 to 0.25 s, dB re full scale as mathematical rms. */
export function soxRmsLevDb(file: string): number {
  const { stderr } = spawnSync('sox', [file, '-n', 'trim', '0.05', '0.2', 'stats'], { encoding: 'utf8' })
  const found = /^RMS lev dB\s+(-?\d+\.\d+)/m.exec(stderr)
  if (!found) throw new RecordingError(`sox gave no level for ${file}.`)
  return Number(found[1])
}

function sox(options: readonly string[]): void {
  try {
    execFileSync('sox', options, { stdio: 'pipe' })
  } catch (error) {
    const missing = (error as NodeJS.ErrnoException).code === 'ENOENT'
    throw new RecordingError(
      missing
        ? 'sox is not installed: install it (on Debian: apt-get install sox), or give a recording with --file.'
        : `sox could not make the recording: ${String((error as { stderr?: Buffer }).stderr).trim()}`,
    )
  }
}

function samplesOf(file: string): Float64Array {
  const wav = new WavFile(file)
  const samples = new Float64Array(wav.header.samples)
  wav.read(samples.length, [samples])
  wav.close()
  return samples
}

import { readFileSync } from 'node:fs'
import path from 'node:path'
import { describe, expect, it } from 'vitest'
import { aWeighting, aWeightingDb } from '../../../simulator/signal/aWeighting.ts'
import { BiquadCascade, gainDb } from '../../../simulator/signal/biquad.ts'
import { measuringBand } from '../../../simulator/signal/measuringBand.ts'
import { rmsDb, sine, whiteNoise } from '../../helpers/signals.ts'
import { projectDir } from '../../helpers/sources.ts'

interface TableEntry {
  id: string
  exact_hz?: number
  A_dB: number
  frequency_hz?: number
}

/** Table 3 of IEC 61672-1:2013 as two public transcriptions print it; the file names them. */
const reference = JSON.parse(
  readFileSync(path.join(projectDir, 'tests/reference/a-weighting.json'), 'utf8'),
) as { values: TableEntry[] }
const table = reference.values.filter((entry) => entry.id.startsWith('iec61672-'))
const RATES = [44_100, 48_000, 88_200, 96_000, 192_000]

describe('aWeightingDb()', () => {
  it('rounds to every value of the table of IEC 61672-1', () => {
    expect(table).toHaveLength(34)
    const off = table.filter(({ exact_hz, A_dB }) => Math.abs(aWeightingDb(exact_hz!) - A_dB) > 0.0501)
    expect(off).toEqual([])
  })

  it('is 0 dB at 1 kHz and -Infinity at 0 Hz', () => {
    expect(aWeightingDb(1000)).toBe(0)
    expect(aWeightingDb(0)).toBe(-Infinity)
  })
})

describe.each(RATES)('aWeighting(%i)', (rateHz) => {
  const sections = aWeighting(rateHz)
  const errorDb = (hz: number) => Math.abs(gainDb(sections, hz, rateHz) - aWeightingDb(hz))

  it('keeps within 0.2 dB of the formula from 20 Hz to 10 kHz, and 0.5 dB to 20 kHz', () => {
    for (let hz = 20; hz <= 10_000; hz *= 1.01) expect(errorDb(hz)).toBeLessThan(0.2)
    for (let hz = 10_000; hz <= 20_000; hz *= 1.005) expect(errorDb(hz)).toBeLessThan(0.5)
  })

  it('weights a sine by what its response says', () => {
    const tone = sine(rateHz, 6000, rateHz, 0.5)
    const before = rmsDb(tone)
    new BiquadCascade(sections).process(tone, tone.length)
    const after = rmsDb(tone.subarray(rateHz / 2))
    expect(Math.abs(after - before - aWeightingDb(6000))).toBeLessThan(0.2)
  })

  it('weights white noise within 0.1 dB of the integral of the formula', () => {
    const band = measuringBand(rateHz)
    let flat = 0
    let exact = 0
    let filtered = 0
    for (let hz = 0.5; hz < rateHz / 2; hz++) {
      const power = 10 ** (gainDb(band, hz, rateHz) / 10)
      flat += power
      exact += power * 10 ** (aWeightingDb(hz) / 10)
      filtered += power * 10 ** (gainDb(sections, hz, rateHz) / 10)
    }
    const exactDb = 10 * Math.log10(exact / flat)
    expect(Math.abs(10 * Math.log10(filtered / flat) - exactDb)).toBeLessThan(0.1)

    const noise = whiteNoise(rateHz * 4, 0.01, 7)
    new BiquadCascade(band).process(noise, noise.length)
    const before = rmsDb(noise)
    new BiquadCascade(sections).process(noise, noise.length)
    expect(Math.abs(rmsDb(noise) - before - exactDb)).toBeLessThan(0.1)
  })
})

describe.each(RATES)('measuringBand(%i)', (rateHz) => {
  it('is flat within 0.1 dB from 20 Hz to 20 kHz and lets no offset through', () => {
    const band = measuringBand(rateHz)
    for (let hz = 20; hz <= 20_000; hz *= 1.01) expect(Math.abs(gainDb(band, hz, rateHz))).toBeLessThan(0.1)
    expect(gainDb(band, 1e-3, rateHz)).toBeLessThan(-100)
  })
})

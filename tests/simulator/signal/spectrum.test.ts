import { describe, expect, it } from 'vitest'
import { noiseScale, powerSpectrum } from '../../../simulator/signal/spectrum.ts'
import { rmsOf, sine, whiteNoise } from '../../helpers/signals.ts'

describe('powerSpectrum()', () => {
  it.each(['hann', 'blackman'] as const)('holds the mean square of a sine in its bin (%s)', (kind) => {
    // 8192 samples padded to 16384: a bin every 2.93 Hz, this tone on bin 341
    const hz = (341 * 48_000) / 16_384
    const { power, binHz } = powerSpectrum(sine(8192, hz, 48_000, 0.5), 48_000, kind, 5000)
    expect(binHz).toBeCloseTo(2.9297, 4)
    expect(power[341]).toBeCloseTo(0.125, 5)
  })

  it.each(['hann', 'blackman'] as const)('adds up to the power of noise in its band (%s)', (kind) => {
    const noise = whiteNoise(65_536, 0.1, 11)
    const spectrum = powerSpectrum(noise, 48_000, kind, 24_000)
    const sum = spectrum.power.reduce((total, power) => total + power, 0) * noiseScale(spectrum, kind)
    expect(10 * Math.log10(sum / rmsOf(noise) ** 2)).toBeCloseTo(0, 1)
  })
})

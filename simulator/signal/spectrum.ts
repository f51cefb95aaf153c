import FFT from 'fft.js'

export interface Spectrum {
  /** squared magnitudes of bins 0.. up to the highest frequency asked for */
  power: Float64Array
  binHz: number
  /** main-lobe half width of the window, Hz */
  lobeHz: number
}

export type WindowKind = 'hann' | 'blackman'
const WINDOWS: Record<WindowKind, { coefficients: readonly number[]; lobeBins: number }> = {
  hann: { coefficients: [0.5, -0.5], lobeBins: 2 },
  blackman: { coefficients: [0.42, -0.5, 0.08], lobeBins: 3 },
}

const transforms = new Map<number, FFT>()
const windows = new Map<string, Float64Array>()

/**
 * Windowed power spectrum, zero-padded to at least twice the length. Scaled so that a bin on a sine of rms r holds
 * r^2; sum over a lobe times `noiseScale` gives the power of a line or of noise.
 */
export function powerSpectrum(
  samples: Float64Array,
  rateHz: number,
  kind: WindowKind,
  highestHz: number,
): Spectrum {
  const size = 2 ** Math.ceil(Math.log2(samples.length * 2))
  const fft = transforms.get(size) ?? new FFT(size)
  transforms.set(size, fft)
  const window = windowOf(kind, samples.length)
  const input = new Float64Array(size)
  for (let i = 0; i < samples.length; i++) input[i] = samples[i]! * window[i]!
  const output = new Float64Array(size * 2)
  fft.realTransform(output, input)
  const bins = Math.min(size / 2, Math.ceil((highestHz * size) / rateHz) + 1)
  const power = new Float64Array(bins)
  const scale = 2 / (samples.length * WINDOWS[kind].coefficients[0]!) ** 2
  for (let k = 0; k < bins; k++) power[k] = (output[2 * k]! ** 2 + output[2 * k + 1]! ** 2) * scale
  return { power, binHz: rateHz / size, lobeHz: (WINDOWS[kind].lobeBins * rateHz) / samples.length }
}

/**
 * What a sum of neighbouring bins must be multiplied with to be a power: bins overlap because of the window and of
 * the padding. `sumOfSquares / sum^2` is the window's noise bandwidth in bins of the unpadded length.
 */
export function noiseScale(spectrum: Spectrum, kind: WindowKind): number {
  const c = WINDOWS[kind].coefficients
  const bandwidthBins = (c[0]! ** 2 + c.slice(1).reduce((sum, a) => sum + (a * a) / 2, 0)) / c[0]! ** 2
  const unpaddedBinHz = spectrum.lobeHz / WINDOWS[kind].lobeBins
  return spectrum.binHz / (unpaddedBinHz * bandwidthBins)
}

function windowOf(kind: WindowKind, length: number): Float64Array {
  const key = `${kind} ${length}`
  const known = windows.get(key)
  if (known) return known
  const { coefficients } = WINDOWS[kind]
  const made = Float64Array.from({ length }, (_, i) =>
    coefficients.reduce((sum, a, n) => sum + a * Math.cos((2 * Math.PI * n * i) / length), 0),
  )
  if (windows.size > 16) windows.clear()
  windows.set(key, made)
  return made
}

/** Boltzmann constant in J/K, exact since the SI of 2019. */
export const BOLTZMANN = 1.380649e-23

/** The band of every level: flat 20 Hz to 20 kHz. */
export const BAND_LOW_HZ = 20
export const BAND_HIGH_HZ = 20_000

/** Johnson-Nyquist noise of a resistance, V^2 per Hz: 4 k T R (Nyquist 1928). */
export function johnsonDensity(resistanceOhm: number, temperatureK: number): number {
  return 4 * BOLTZMANN * temperatureK * resistanceOhm
}

/**
 * The limit of a capacitor whose only loss is a resistance across it: k T / C in V^2 over all frequencies, whatever
 * the resistance (equipartition). 500 pF at 300 K: (2.88 uV)^2.
 */
export function capacitorNoisePower(capacitanceF: number, temperatureK: number): number {
  return (BOLTZMANN * temperatureK) / capacitanceF
}

/** Corner of a resistance across a capacitance, Hz: 1 / (2 pi R C). */
export function cornerHz(resistanceOhm: number, capacitanceF: number): number {
  return 1 / (2 * Math.PI * resistanceOhm * capacitanceF)
}

/** Power gain of the first-order high-pass that R and C make: 1 / (1 + (fc/f)^2). */
export function highPassPower(frequencyHz: number, cornerFrequencyHz: number): number {
  const ratio = cornerFrequencyHz / frequencyHz
  return 1 / (1 + ratio * ratio)
}

/**
 * Noise of a resistance with a capacitance across it in a band, V^2. The density 4kTR / (1 + (f/fc)^2) has the
 * integral (2/pi) (kT/C) [atan(f/fc)], so that the whole band from 0 to infinity gives kT/C.
 */
export function shuntNoisePower(
  resistanceOhm: number,
  capacitanceF: number,
  temperatureK: number,
  lowHz: number,
  highHz: number,
): number {
  if (!(resistanceOhm > 0)) return 0
  const corner = cornerHz(resistanceOhm, capacitanceF)
  const turn = Math.atan(highHz / corner) - Math.atan(lowHz / corner)
  return capacitorNoisePower(capacitanceF, temperatureK) * (2 / Math.PI) * turn
}

/**
 * Power gain of the A-weighting at a frequency, 1 at 1 kHz (formula and pole frequencies of IEC 61672-1, annex E).
 */
export function aWeightingPower(frequencyHz: number): number {
  return rawA(frequencyHz) / rawA(1000)
}

function rawA(frequencyHz: number): number {
  const f2 = frequencyHz * frequencyHz
  const gain =
    (12194.2171 ** 2 * f2 * f2) /
    ((f2 + 20.599 ** 2) * Math.sqrt((f2 + 107.65265 ** 2) * (f2 + 737.86223 ** 2)) * (f2 + 12194.2171 ** 2))
  return gain * gain
}

/** What a noise shape gives in the band: power flat and A-weighted, and the degrees of freedom of a frame's rms. */
export interface BandNoise {
  flatPower: number
  aPower: number
  flatDof: number
  aDof: number
}

const STEPS = 96
const GRID_HZ = Array.from(
  { length: STEPS },
  (_, i) => BAND_LOW_HZ * Math.pow(BAND_HIGH_HZ / BAND_LOW_HZ, (i + 0.5) / STEPS),
)
const GRID_LOG_STEP = Math.log(BAND_HIGH_HZ / BAND_LOW_HZ) / STEPS
const GRID_A = GRID_HZ.map(aWeightingPower)

/**
 * Integrates a power density (V^2 per Hz) over the band on a logarithmic grid. The rms of a frame of length T has
 * about 2 B T degrees of freedom with the statistical bandwidth B = (integral S)^2 / integral S^2, never below 1.
 */
export function bandNoise(density: (frequencyHz: number) => number, frameS: number): BandNoise {
  let flat = 0
  let flatSquare = 0
  let a = 0
  let aSquare = 0
  for (let i = 0; i < STEPS; i++) {
    const frequency = GRID_HZ[i]!
    const width = frequency * GRID_LOG_STEP
    const value = density(frequency)
    const weighted = value * GRID_A[i]!
    flat += value * width
    flatSquare += value * value * width
    a += weighted * width
    aSquare += weighted * weighted * width
  }
  return {
    flatPower: flat,
    aPower: a,
    flatDof: flat > 0 ? Math.max(1, (2 * frameS * flat * flat) / flatSquare) : 1,
    aDof: a > 0 ? Math.max(1, (2 * frameS * a * a) / aSquare) : 1,
  }
}

/**
 * Relative power of one frame of noise: chi-square over its degrees of freedom, by the cube rule of Wilson and
 * Hilferty, from a standard normal number. Mean 1.
 */
export function chiSquareRatio(dof: number, normal: number): number {
  const spread = 2 / (9 * dof)
  const root = 1 - spread + normal * Math.sqrt(spread)
  return root > 0 ? root * root * root : 0
}

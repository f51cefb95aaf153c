import { powerSpectrum } from './spectrum.ts'
import type { Spectrum } from './spectrum.ts'

/** Name and version of this way to tell a pitch; kept with every run. */
export const PITCH_ALGORITHM = 'harmonic-sieve-1'

/** A found pitch; confidence 0..1 is the part of the window's power that the reported pitches explain. */
export interface FoundPitch {
  hz: number
  confidence: number
}

const LOWEST_HZ = 60
const HIGHEST_HZ = 720
/** Above this the partials of wound strings are too far from whole multiples to tell strings apart. */
const BAND_HZ = 1500
const MOST_HARMONICS = 16
/** Peaks further below the strongest are leakage, hum or a string that only rings along. */
const PEAK_RANGE_DB = 40
const FUNDAMENTAL_RANGE_DB = 30
/** Of pitches that explain the same, the highest is the string: every lower one is only a sub-multiple of it. */
const SAME_SHARE = 0.03
/**
 * Parts of the power from which the partials at every second, third or fourth place are a string of their own and
 * what lies between is another one that rings along: no place of plucking gives one string such a row.
 */
const OWN_ROW_POWER: Readonly<Record<number, number>> = { 2: 0.968, 3: 0.9, 4: 0.9 }
/** A second string this far below the first adds less than 0.15 dB to a level. */
const SECOND_RANGE_DB = 15
const LEAST_CONFIDENCE = 0.5
/** Compression of amplitudes, so that weak odd partials still speak for the lower octave. */
const COMPRESSION = 0.6

interface Peak {
  hz: number
  power: number
  weight: number
}

interface Candidate {
  hz: number
  /** peak of each harmonic, index 0 = fundamental */
  harmonics: (Peak | null)[]
  share: number
}

/**
 * The pitch of a plucked string in samples of at least 60 ms, and a second one when two strings sound; empty when
 * nothing in them has a pitch. Partials are taken from a Blackman-windowed spectrum, each candidate fundamental is
 * credited with the partials near its multiples (followed upwards, so that stiffness may stretch them), and the
 * highest fundamental that explains all of them wins.
 *
 * `expectedHz` (pitches of each string) only names pairs whose partials fall together, as a course in octaves: there
 * the second one is reported if its multiples stand out of the row, never because it is expected.
 */
export function findPitches(
  samples: Float64Array,
  rateHz: number,
  expectedHz: readonly (readonly number[])[] = [],
): FoundPitch[] {
  const spectrum = powerSpectrum(samples, rateHz, 'blackman', BAND_HZ * 1.1)
  const peaks = findPeaks(spectrum)
  if (peaks.length === 0) return []
  const candidates = candidatesOf(peaks, peaks)
  const first = highestOfBest(candidates)
  if (!first) return []
  const found = [first.hz]
  const explained = new Set(peaksOf(first))
  const second = secondOf(peaks, first, explained)
  if (second) {
    found.push(second.hz)
    for (const peak of peaksOf(second)) explained.add(peak)
  } else {
    const hidden = hiddenPitch(first, expectedHz)
    if (hidden) found.push(hidden)
  }
  const confidence = explainedShare(spectrum, [...explained])
  return confidence < LEAST_CONFIDENCE ? [] : found.map((hz) => ({ hz, confidence }))
}

function peaksOf(candidate: Candidate): Peak[] {
  return candidate.harmonics.filter((peak) => peak !== null)
}

function findPeaks({ power, binHz, lobeHz }: Spectrum): Peak[] {
  const from = Math.ceil((LOWEST_HZ * 0.9) / binHz)
  const to = Math.min(power.length - 2, Math.floor(BAND_HZ / binHz))
  let strongest = 0
  for (let k = from; k <= to; k++) strongest = Math.max(strongest, power[k]!)
  if (!(strongest > 0)) return []
  const sorted = power.slice(from, to + 1).sort()
  const middle = sorted[Math.floor(sorted.length / 2)]!
  const least = Math.max(middle * 16, strongest * 10 ** (-PEAK_RANGE_DB / 10))
  const reach = Math.max(1, Math.floor((0.6 * lobeHz) / binHz))
  const peaks: Peak[] = []
  for (let k = from; k <= to; k++) {
    const here = power[k]!
    if (here < least || !isHighest(power, k, reach)) continue
    const [a, b, c] = [Math.log(power[k - 1]!), Math.log(here), Math.log(power[k + 1]!)]
    const shift = (0.5 * (a - c)) / (a - 2 * b + c)
    peaks.push({ hz: (k + shift) * binHz, power: here, weight: here ** (COMPRESSION / 2) })
  }
  return peaks
}

function isHighest(power: Float64Array, k: number, reach: number): boolean {
  for (let d = 1; d <= reach; d++)
    if (power[k]! <= (power[k - d] ?? 0) || power[k]! < (power[k + d] ?? 0)) return false
  return true
}

/** Candidates whose fundamental is one of `roots`, credited with peaks of `all`; the best first. */
function candidatesOf(roots: readonly Peak[], all: readonly Peak[]): Candidate[] {
  const strongest = Math.max(...roots.map((peak) => peak.power))
  const total = all.reduce((sum, peak) => sum + peak.weight, 0)
  const candidates: Candidate[] = []
  for (const root of roots) {
    if (
      root.hz > LOWEST_HZ &&
      root.hz < HIGHEST_HZ &&
      root.power > strongest * 10 ** (-FUNDAMENTAL_RANGE_DB / 10)
    )
      candidates.push(candidateAt(root.hz, all, total))
    for (const divisor of [2, 3]) {
      const hz = root.hz / divisor
      if (hz < LOWEST_HZ || hz > HIGHEST_HZ || root.power < strongest / 100) continue
      const candidate = candidateAt(hz, all, total)
      if (!candidate.harmonics[0] && standsWithoutFundamental(candidate)) candidates.push(candidate)
    }
  }
  return candidates.sort((a, b) => b.share - a.share)
}

/** A fundamental may be lost to a thin input; then the row above it must be nearly whole. */
function standsWithoutFundamental({ harmonics }: Candidate): boolean {
  const there = [2, 3, 4, 5, 6, 7].filter((n) => harmonics[n - 1])
  return there.length >= 4 && there.includes(3) && (there.includes(5) || there.includes(7))
}

function candidateAt(hz: number, all: readonly Peak[], total: number): Candidate {
  const harmonics: (Peak | null)[] = []
  let ratio = hz
  let sum = 0
  let weights = 0
  let explained = 0
  for (let n = 1; n <= MOST_HARMONICS && n * ratio < BAND_HZ; n++) {
    const wanted = n * ratio
    const peak = nearest(all, wanted, Math.max(2.5, 0.012 * wanted))
    harmonics.push(peak)
    if (!peak) continue
    explained += peak.weight
    const own = peak.hz / n
    if (own > hz * 0.985 && own < hz * 1.05) ratio = own
    if (n <= 6) {
      sum += own * peak.weight * n
      weights += peak.weight * n
    }
  }
  return { hz: weights > 0 ? sum / weights : hz, harmonics, share: explained / total }
}

function nearest(peaks: readonly Peak[], hz: number, toleranceHz: number): Peak | null {
  let best: Peak | null = null
  for (const peak of peaks) {
    const distance = Math.abs(peak.hz - hz)
    if (distance <= toleranceHz && (!best || distance < Math.abs(best.hz - hz))) best = peak
  }
  return best
}

function highestOfBest(candidates: readonly Candidate[]): Candidate | null {
  const best = candidates[0]
  if (!best) return null
  const bestPower = powerOf(peaksOf(best))
  return candidates
    .filter((candidate) => {
      if (candidate.share >= best.share - SAME_SHARE) return true
      const multiple = Math.round(candidate.hz / best.hz)
      const least = near(candidate.hz / multiple, best.hz, 0.01) ? OWN_ROW_POWER[multiple] : undefined
      return least !== undefined && powerOf(peaksOf(candidate)) >= least * bestPower
    })
    .reduce((highest, candidate) => (candidate.hz > highest.hz ? candidate : highest))
}

function powerOf(peaks: readonly Peak[]): number {
  return peaks.reduce((sum, peak) => sum + peak.power, 0)
}

function near(a: number, b: number, within: number): boolean {
  return Math.abs(a / b - 1) < within
}

/** A second string: its fundamental and one more partial, unexplained by the first, and loud enough to matter. */
function secondOf(peaks: readonly Peak[], first: Candidate, explained: ReadonlySet<Peak>): Candidate | null {
  const left = peaks.filter((peak) => !explained.has(peak))
  if (left.length === 0) return null
  const least = powerOf(peaksOf(first)) * 10 ** (-SECOND_RANGE_DB / 10)
  const candidates = candidatesOf(left, left).filter((candidate) => {
    const own = peaksOf(candidate)
    const whole = candidateAt(candidate.hz, peaks, 1)
    return candidate.harmonics[0] && powerOf(own) >= least && peaksOf(whole).length >= 2
  })
  return highestOfBest(candidates)
}

/** Pitches of the expected ones that are whole multiples of the one found, and stand out of its row of partials. */
function hiddenPitch(first: Candidate, expectedHz: readonly (readonly number[])[]): number | null {
  for (const own of expectedHz) {
    if (!own.some((hz) => near(first.hz, hz, 0.03))) continue
    for (const other of expectedHz)
      for (const hz of other) {
        const multiple = Math.round(hz / first.hz)
        if (multiple < 2 || multiple > 4 || !near(hz / multiple, first.hz, 0.03)) continue
        const stands = own === other ? octaveStandsOut(first, multiple) : rowStandsOut(first, multiple)
        if (stands) return multiple * first.hz
      }
  }
  return null
}

const levelOf = (peak: Peak | null | undefined) => (peak ? 10 * Math.log10(peak.power) : null)

/** Every multiple of `multiple` stands well above both its neighbours: no place of plucking does that. */
function rowStandsOut({ harmonics }: Candidate, multiple: number): boolean {
  const rises: number[] = []
  for (let n = multiple; n < harmonics.length && rises.length < 3; n += multiple) {
    const here = levelOf(harmonics[n - 1])
    if (here === null) return false
    const beside = [levelOf(harmonics[n - 2]), levelOf(harmonics[n])].filter((level) => level !== null)
    rises.push(beside.length === 0 ? PEAK_RANGE_DB / 2 : here - Math.max(...beside))
  }
  if (rises.length < 2) return false
  return Math.min(...rises) >= 6 && rises.reduce((sum, rise) => sum + rise, 0) / rises.length >= 12
}

/** The even partials lie above the line through the odd ones: the course's octave string sounds too. */
function octaveStandsOut({ harmonics }: Candidate, multiple: number): boolean {
  const points = harmonics
    .slice(0, 8)
    .map((peak, i) => ({ n: i + 1, x: Math.log2(i + 1), y: levelOf(peak) }))
    .filter((point): point is { n: number; x: number; y: number } => point.y !== null)
  const own = points.filter((point) => point.n % multiple !== 0)
  const shared = points.filter((point) => point.n % multiple === 0)
  if (own.length < 3 || shared.length < 2) return false
  const mean = (values: number[]) => values.reduce((sum, value) => sum + value, 0) / values.length
  const [mx, my] = [mean(own.map((p) => p.x)), mean(own.map((p) => p.y))]
  const slope =
    own.reduce((sum, p) => sum + (p.x - mx) * (p.y - my), 0) /
    own.reduce((sum, p) => sum + (p.x - mx) ** 2, 0)
  return mean(shared.map((p) => p.y - my - slope * (p.x - mx))) >= 4.5
}

/** Part of the band's power that lies in the main lobes of these peaks, 0..1. */
function explainedShare(spectrum: Spectrum, peaks: readonly Peak[]): number {
  const { power, binHz, lobeHz } = spectrum
  const from = Math.ceil((LOWEST_HZ * 0.9) / binHz)
  const to = Math.min(power.length - 1, Math.floor(BAND_HZ / binHz))
  let total = 0
  let explained = 0
  for (let k = from; k <= to; k++) {
    total += power[k]!
    if (peaks.some((peak) => Math.abs(peak.hz - k * binHz) <= lobeHz)) explained += power[k]!
  }
  return total > 0 ? explained / total : 0
}

import { bilinear, gainDb } from './biquad.ts'
import type { Biquad } from './biquad.ts'

/**
 * Pole frequencies of IEC 61672-1:2013 before rounding (5.5.6 gives them as 20.60, 107.7, 737.9 and 12194 Hz); the
 * closed form of its Annex E is from memory and agrees with the rounded values.
 */
const F1_HZ = 20.598997
const F2_HZ = 107.65265
const F3_HZ = 737.86223
const F4_HZ = 12194.217
const FIT_TO_HZ = 20_000

/**
 * A-weighting of IEC 61672-1 as three biquads, 0 dB at 1 kHz.
 *
 * The high-pass poles lie far below half the rate, where the bilinear transform is exact enough. The double pole at
 * 12.2 kHz does not: a bilinear one is 3 dB low at 16 kHz for a rate of 44.1 kHz. Its section is therefore fitted to
 * the magnitude itself up to 20 kHz.
 */
export function aWeighting(rateHz: number): Biquad[] {
  const [w1, w2, w3] = [F1_HZ, F2_HZ, F3_HZ].map((hz) => 2 * Math.PI * hz) as [number, number, number]
  const sections = [
    bilinear([1, 0, 0], [1, 2 * w1, w1 * w1], rateHz),
    bilinear([1, 0, 0], [1, w2 + w3, w2 * w3], rateHz),
    upperSection(rateHz),
  ]
  const scale = 10 ** (-gainDb(sections, 1000, rateHz) / 20)
  const first = sections[0]!
  sections[0] = { ...first, b0: first.b0 * scale, b1: first.b1 * scale, b2: first.b2 * scale }
  return sections
}

/** Formula of IEC 61672-1 (5.5.6), dB re 1 kHz; -Infinity at 0 Hz. */
export function aWeightingDb(hz: number): number {
  return 20 * Math.log10(magnitude(hz) / magnitude(1000))
}

function magnitude(hz: number): number {
  const f2 = hz * hz
  return (
    (F4_HZ ** 2 * f2 * f2) /
    ((f2 + F1_HZ ** 2) * Math.sqrt(f2 + F2_HZ ** 2) * Math.sqrt(f2 + F3_HZ ** 2) * (f2 + F4_HZ ** 2))
  )
}

/**
 * Squared magnitudes are written as polynomials in p = sin^2(w/2). The section has a double pole z = q, that is
 * (1 + d p)^2 below, and 1 + n1 p + n2 p^2 above, which is made exact at two frequencies by solving for n1 and n2.
 * The pole and the pair of frequencies with the smallest largest error up to 20 kHz are taken.
 */
function upperSection(rateHz: number): Biquad {
  let best: { error: number; q: number; n1: number; n2: number } | null = null
  for (let hundredth = -50; hundredth <= 80; hundredth++) {
    const q = hundredth / 100
    for (const lower of [6000, 8000, 10_000, 12_000, 15_000])
      for (const upper of [18_500, 19_000, 19_500]) {
        const fit = numeratorThrough(lower, upper, q, rateHz)
        const error = largestErrorDb(fit, q, rateHz)
        if (!best || error < best.error) best = { error, q, ...fit }
      }
  }
  return minimumPhase(best!.n1, best!.n2, best!.q)
}

function target(hz: number): number {
  return 1 / (1 + (hz / F4_HZ) ** 2) ** 2
}

function poleTerm(q: number, p: number): number {
  return (1 + ((4 * q) / (1 - q) ** 2) * p) ** 2
}

function sineSquared(hz: number, rateHz: number): number {
  return Math.sin((Math.PI * hz) / rateHz) ** 2
}

function numeratorThrough(lower: number, upper: number, q: number, rateHz: number) {
  const [pa, pb] = [sineSquared(lower, rateHz), sineSquared(upper, rateHz)]
  const ra = (target(lower) * poleTerm(q, pa) - 1) / pa
  const rb = (target(upper) * poleTerm(q, pb) - 1) / pb
  const n2 = (rb - ra) / (pb - pa)
  return { n1: ra - n2 * pa, n2 }
}

function largestErrorDb({ n1, n2 }: { n1: number; n2: number }, q: number, rateHz: number): number {
  let largest = 0
  for (let step = 0; step <= 60; step++) {
    const hz = 500 + (step / 60) * (FIT_TO_HZ - 500)
    const p = sineSquared(hz, rateHz)
    const ratio = (1 + n1 * p + n2 * p * p) / poleTerm(q, p) / target(hz)
    largest = Math.max(largest, ratio > 0 ? Math.abs(10 * Math.log10(ratio)) : Infinity)
  }
  const realisable = 1 + n1 + n2 > 0 && ((1 + Math.sqrt(1 + n1 + n2)) / 2) ** 2 >= n2 / 4
  return realisable ? largest : Infinity
}

/** The section with zeros inside the unit circle whose squared magnitude is (1 + n1 p + n2 p^2) / (1 + d p)^2. */
function minimumPhase(n1: number, n2: number, q: number): Biquad {
  const atNyquist = Math.sqrt(1 + n1 + n2)
  const half = (1 + atNyquist) / 2
  const c0 = (half + Math.sqrt(half * half - n2 / 4)) / 2
  const c1 = (1 - atNyquist) / 2
  const c2 = n2 / 16 / c0
  const scale = (1 - q) ** 2
  return { b0: c0 * scale, b1: c1 * scale, b2: c2 * scale, a1: -2 * q, a2: q * q }
}

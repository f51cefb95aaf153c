import { COVERAGE, SIMULATION_DRAWS, SIMULATION_SEED } from './constants.ts'
import { rangeDb } from './rangeDb.ts'
import { chiSquareFrom, normalFrom, seededRandom } from './seededRandom.ts'
import { stepDb } from './stepDb.ts'
import type { IndependentParts } from './balanceUncertainty.ts'

/** What the simulation says about one reading, dB. */
export interface SimulatedSpread {
  /** standard deviation of the draws */
  u: number
  /** larger distance from the reading to an end of the symmetric 95 % interval */
  expandedTwoSided: number
  /** distance from the reading to the 95 % point of the draws */
  expandedOneSided: number
  /** share of draws not above the limit */
  shareUpTo: (limit: number) => number
}

/**
 * Uncertainty of range and step by simulation, because neither is linear in the levels (JCGM 101): every balance is
 * drawn 10,000 times from its independent parts, the scatter of all strings with one common chi-square since it is
 * one pooled estimate. Seeded: the same input gives the same numbers. In: balances in dB, all finite, string 1
 * first; their parts; u of the pattern. null when a balance or its parts are missing.
 */
export function rangeStepUncertainty(
  balancesDb: readonly (number | null)[],
  parts: readonly (IndependentParts | null)[],
  uPatternDb: number,
): { range: SimulatedSpread; step: SimulatedSpread } | null {
  const range = rangeDb(balancesDb)
  const step = stepDb(balancesDb)
  if (range === null || step === null || parts.some((part) => part === null)) return null
  const random = seededRandom(SIMULATION_SEED)
  const normal = normalFrom(random)
  const ranges = new Float64Array(SIMULATION_DRAWS)
  const steps = new Float64Array(SIMULATION_DRAWS)
  const dof = parts[0]!.scatter.dof
  const drawn = new Float64Array(parts.length)
  const scatterSquares = parts.map((part) => part!.scatter.u ** 2)
  const otherSquares = parts.map((part) => part!.own.u ** 2 + uPatternDb ** 2)
  for (let i = 0; i < SIMULATION_DRAWS; i++) {
    // given the drawn variance, scatter and the other parts are normal and one draw serves both
    const stretch = dof === null ? 1 : dof / chiSquareFrom(normal, random, dof)
    for (let e = 0; e < drawn.length; e++) {
      drawn[e] = balancesDb[e]! + Math.sqrt(scatterSquares[e]! * stretch + otherSquares[e]!) * normal()
    }
    spreadInto(drawn, i, ranges, steps)
  }
  return { range: spreadOf(range, ranges), step: spreadOf(step, steps) }
}

/** Range and step of one draw, as rangeDb and stepDb define them for values that are all there. */
function spreadInto(drawn: Float64Array, i: number, ranges: Float64Array, steps: Float64Array): void {
  let high = drawn[0]!
  let low = high
  let step = 0
  for (let e = 1; e < drawn.length; e++) {
    const value = drawn[e]!
    if (value > high) high = value
    else if (value < low) low = value
    const difference = Math.abs(value - drawn[e - 1]!)
    if (difference > step) step = difference
  }
  ranges[i] = high - low
  steps[i] = step
}

function spreadOf(value: number, draws: Float64Array): SimulatedSpread {
  draws.sort()
  const count = draws.length
  let sum = 0
  for (const draw of draws) sum += draw
  const mean = sum / count
  let squares = 0
  for (const draw of draws) squares += (draw - mean) * (draw - mean)
  const tail = Math.round((count * (1 - COVERAGE)) / 2)
  return {
    u: Math.sqrt(squares / (count - 1)),
    expandedTwoSided: Math.max(0, draws[count - tail - 1]! - value, value - draws[tail]!),
    expandedOneSided: Math.max(0, draws[Math.round(count * COVERAGE) - 1]! - value),
    shareUpTo: (limit) => (draws.findLastIndex((draw) => draw <= limit) + 1) / count,
  }
}

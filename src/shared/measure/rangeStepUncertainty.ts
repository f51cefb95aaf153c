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
  const drawn: number[] = balancesDb.map(() => 0)
  for (let i = 0; i < SIMULATION_DRAWS; i++) {
    const stretch = dof === null ? 1 : Math.sqrt(dof / chiSquareFrom(normal, random, dof))
    for (let e = 0; e < drawn.length; e++) {
      const part = parts[e]!
      drawn[e] =
        balancesDb[e]! + part.scatter.u * stretch * normal() + Math.hypot(part.own.u, uPatternDb) * normal()
    }
    ranges[i] = rangeDb(drawn)!
    steps[i] = stepDb(drawn)!
  }
  return { range: spreadOf(range, ranges), step: spreadOf(step, steps) }
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

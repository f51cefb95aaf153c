import { REFERENCE_WITHIN_DB } from './constants.ts'
import { meanOf } from './meanOf.ts'
import { medianOf } from './medianOf.ts'

/** A level of one element as the balance sees it. levelDb null: none; atMost: the level is at most levelDb. */
export interface ElementLevel {
  levelDb: number | null
  atMost: boolean
}

export interface Reference {
  /** mean of the members, dBV; null when there is none */
  referenceDb: number | null
  /** for each element: it is part of the reference */
  members: boolean[]
}

/**
 * The level that balances are taken from: the mean of those elements that are not censored and lie within 6 dB of
 * the median of all that have a level, so that one dead string does not make five good ones loud. A censored
 * element enters the median with its bound. In and out: dBV. Levels that are not finite are as good as none.
 *
 * @example referenceOf([-20, -21, -19, -20, -22, -60].map((levelDb) => ({ levelDb, atMost: false }))).members[5] // false
 */
export function referenceOf(elements: readonly ElementLevel[]): Reference {
  const known = elements.map((element) => (Number.isFinite(element.levelDb) ? element.levelDb! : NaN))
  const median = medianOf(known)
  const members = elements.map(
    (element, i) => median !== null && !element.atMost && Math.abs(known[i]! - median) <= REFERENCE_WITHIN_DB,
  )
  return { referenceDb: meanOf(known.filter((_, i) => members[i])), members }
}

/**
 * Balance of an element: level - reference - pattern. In: dBV, dBV, dB. Out: dB; null when a part is missing or not
 * finite. A censored level gives a censored balance.
 *
 * @example balanceDb(-21, -20, 0.5) // -1.5
 */
export function balanceDb(
  levelDb: number | null,
  referenceDb: number | null,
  patternDb: number,
): number | null {
  if (levelDb === null || referenceDb === null) return null
  const balance = levelDb - referenceDb - patternDb
  return Number.isFinite(balance) ? balance : null
}

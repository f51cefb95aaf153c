import { sampleSd } from './sampleSd.ts'

export interface PooledSd {
  sd: number
  /** degrees of freedom, sum of n - 1; null: so well known that they do not matter */
  dof: number | null
}

/**
 * Pooled sample standard deviation of groups: sqrt(sum (n_i - 1) s_i^2 / sum (n_i - 1)) (JCGM 100, H.3.6 in kind).
 * Unit of the values. Groups of fewer than two values do not count; null when none is left or the result is not
 * finite.
 *
 * @example pooledSd([[-1, 0, 1], [4, 5, 6]]) // { sd: 1, dof: 4 }
 */
export function pooledSd(groups: readonly (readonly number[])[]): PooledSd | null {
  let squares = 0
  let dof = 0
  for (const group of groups) {
    const sd = sampleSd(group)
    if (sd === null) continue
    squares += (group.length - 1) * sd * sd
    dof += group.length - 1
  }
  if (dof === 0) return null
  const sd = Math.sqrt(squares / dof)
  return Number.isFinite(sd) ? { sd, dof } : null
}

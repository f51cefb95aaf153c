/** One independent part of a combined uncertainty: sensitivity times u, and its degrees of freedom (null: infinite). */
export interface UncertaintyPart {
  u: number
  dof: number | null
}

/** Combined standard uncertainty: root of the sum of squares of independent parts (JCGM 100, 5.1.2). Unit of the parts. */
export function combinedU(parts: readonly UncertaintyPart[]): number {
  let squares = 0
  for (const part of parts) squares += part.u * part.u
  return Math.sqrt(squares)
}

/**
 * Effective degrees of freedom: u^4 / sum(u_i^4 / dof_i) (Welch-Satterthwaite, JCGM 100, G.4). null for infinite:
 * no part, no uncertainty, or none with finite degrees of freedom.
 *
 * @example welchSatterthwaite([{ u: 1, dof: 4 }, { u: 1, dof: 4 }]) // 8
 */
export function welchSatterthwaite(parts: readonly UncertaintyPart[]): number | null {
  let below = 0
  for (const part of parts) if (part.dof !== null) below += Math.pow(part.u, 4) / part.dof
  const dof = Math.pow(combinedU(parts), 4) / below
  return Number.isFinite(dof) && dof > 0 ? dof : null
}

import { combinedU, type UncertaintyPart } from './welchSatterthwaite.ts'

/** Parts of one element's level that are independent of the other elements'. */
export interface IndependentParts {
  scatter: UncertaintyPart
  own: UncertaintyPart
}

/**
 * Parts of the uncertainty of a balance. With all six in the reference: u^2(b_e) = (5/6)^2 u_e^2 + (1/36) sum of the
 * other u_j^2 + u^2(pattern_e). In general, with m members: a member counts ((m-1)/m)^2 itself and 1/m^2 for each
 * other member; an element outside the reference counts whole and 1/m^2 for each member. Only what is independent
 * between channels enters. The scatter of all strings is one pooled estimate, so it stays one part with its degrees
 * of freedom. dB. `elements[i]` null: no level. Empty when the element or the reference has none.
 */
export function balanceUncertainty(
  element: number,
  elements: readonly (IndependentParts | null)[],
  members: readonly boolean[],
  uPatternDb: number,
): UncertaintyPart[] {
  const self = elements[element]
  const m = members.filter(Boolean).length
  if (!self || m === 0) return []
  const scatter: UncertaintyPart[] = []
  const own: UncertaintyPart[] = [{ u: uPatternDb, dof: null }]
  elements.forEach((parts, j) => {
    if (!parts) return
    const inReference = members[j] === true ? 1 / m : 0
    const weight = j === element ? 1 - inReference : inReference
    if (weight === 0) return
    scatter.push({ u: weight * parts.scatter.u, dof: parts.scatter.dof })
    own.push({ u: weight * parts.own.u, dof: null })
  })
  return [
    { u: combinedU(scatter), dof: self.scatter.dof },
    { u: combinedU(own), dof: null },
  ]
}

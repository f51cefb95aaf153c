import { RULES, type RuleId } from '../contract/rules.ts'
import type { Unit } from '../contract/quantities.ts'

/** Unit of a rule's value and limits. */
export function unitOf(rule: RuleId): Unit {
  return RULES[rule].unit
}

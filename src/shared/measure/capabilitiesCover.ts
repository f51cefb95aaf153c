import { RULES, type Capability, type RuleId } from '../contract/rules.ts'

/**
 * Whether a bench with these capabilities can measure what a rule needs: all of its `needs` and, where it names
 * some, one of its `needsAny`.
 *
 * @example capabilitiesCover('balance', ['jackLevel']) // true
 */
export function capabilitiesCover(rule: RuleId, capabilities: readonly Capability[]): boolean {
  const { needs, needsAny } = RULES[rule]
  return (
    needs.every((need) => capabilities.includes(need)) &&
    (needsAny === undefined || needsAny.some((need) => capabilities.includes(need)))
  )
}

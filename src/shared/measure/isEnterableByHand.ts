import type { RuleId } from '../contract/rules.ts'

const ENTERABLE: readonly RuleId[] = [
  'noiseFlat',
  'noiseA',
  'hum',
  'switchOpen',
  'switchClosed',
  'tipContinuity',
  'contactTip',
  'contactRing',
  'contactSleeve',
  'insulation',
  'currentPlugged',
  'currentUnplugged',
  'battery',
]

/**
 * Whether a rule's value can be read from a hand-held meter and typed in. What needs the pluck's window, the same
 * point of the circuit twice, or microseconds, cannot. Yes/no rules are entered as 1 or 0.
 */
export function isEnterableByHand(rule: RuleId): boolean {
  return ENTERABLE.includes(rule)
}

import { RULES, type RuleId } from '../../shared/contract/rules.ts'
import type { Unit } from '../../shared/contract/quantities.ts'
import type { RunView } from '../../shared/contract/runs.ts'
import { capabilitiesCover } from '../../shared/measure/capabilitiesCover.ts'
import { isEnterableByHand } from '../../shared/measure/isEnterableByHand.ts'

/** Units that a meter may show, and what one of them is in the unit of the rule. */
export const ENTRY_UNITS: Record<Unit, { name: string; factor: number }[]> = {
  dB: [{ name: 'dB', factor: 1 }],
  dBV: [{ name: 'dBV', factor: 1 }],
  ohm: [
    { name: 'm\u03a9', factor: 0.001 },
    { name: '\u03a9', factor: 1 },
  ],
  Mohm: [
    { name: 'k\u03a9', factor: 0.001 },
    { name: 'M\u03a9', factor: 1 },
    { name: 'G\u03a9', factor: 1000 },
  ],
  mA: [
    { name: '\u00b5A', factor: 0.001 },
    { name: 'mA', factor: 1 },
  ],
  uA: [
    { name: '\u00b5A', factor: 1 },
    { name: 'mA', factor: 1000 },
  ],
  V: [
    { name: 'mV', factor: 0.001 },
    { name: 'V', factor: 1 },
  ],
  ms: [
    { name: 'ms', factor: 1 },
    { name: 's', factor: 1000 },
  ],
  count: [{ name: '', factor: 1 }],
  'yes/no': [{ name: '', factor: 1 }],
}

/** The unit that is offered first: the one in which this rule's limit is written by people. */
export function firstUnitOf(rule: RuleId): string {
  const units = ENTRY_UNITS[RULES[rule].unit]
  const limit = RULES[rule].high ?? RULES[rule].low ?? 1
  return (
    units.find((unit) => Math.abs(limit) / unit.factor >= 1 && Math.abs(limit) / unit.factor < 1000) ??
    units[0]!
  ).name
}

/** Rules of the run's sheet that this bench cannot measure, so that a person with a meter may. */
export function enterableRules(view: RunView): RuleId[] {
  return view.setup.sheet.rules
    .map((entry) => entry.rule)
    .filter((rule) => isEnterableByHand(rule) && !capabilitiesCover(rule, view.setup.capabilities))
}

/**
 * Standard uncertainty of a meter that is good to plus or minus `halfWidth`: a / sqrt 3, a rectangular distribution
 * (JCGM 100:2008, 4.3.7).
 */
export function standardUncertaintyOf(halfWidth: number): number {
  return halfWidth / Math.sqrt(3)
}

import type { RuleResult } from '../contract/measured.ts'
import type { RuleId } from '../contract/rules.ts'
import type { SheetRule } from '../contract/thresholds.ts'
import { patternInForce, type EvaluatedRun } from './evaluateRun.ts'
import { decideRule, judgeRule, type Decision, type JudgeOptions, type RuleFact } from './judgeRule.ts'
import { readNoise, type NoiseReadings } from './noiseReadings.ts'
import { ruleFact, stringsOfRule } from './ruleFacts.ts'
import { isPerElement } from './runPlan.ts'
import type { RunState } from './state.ts'

const PATTERN_RULES: readonly RuleId[] = ['balance', 'range', 'step']

/** Every rule of the sheet, judged on the run so far: in the sheet's order, string 1 first. */
export function judgeRun(
  state: RunState,
  evaluated: EvaluatedRun,
  noise: NoiseReadings = readNoise(state, evaluated),
): RuleResult[] {
  return eachRule(state, evaluated, noise, judgeRule)
}

/** The same without the numbers, at a fraction of the cost. */
export function decideRun(state: RunState, evaluated: EvaluatedRun): Decision[] {
  return eachRule(state, evaluated, readNoise(state, evaluated), decideRule)
}

function eachRule<T>(
  state: RunState,
  evaluated: EvaluatedRun,
  noise: NoiseReadings,
  judge: (rule: SheetRule, fact: RuleFact, options: JudgeOptions) => T,
): T[] {
  const withoutPattern = patternInForce(state.setup.sheet) === null
  return state.setup.sheet.rules.flatMap((rule) =>
    stringsOfRule(isPerElement(rule.rule)).map((stringNo) =>
      judge(rule, ruleFact(state, evaluated, noise, rule.rule, stringNo), {
        stringNo,
        guard: guardOf(state, rule.rule),
        patternMissing: withoutPattern && PATTERN_RULES.includes(rule.rule),
      }),
    ),
  )
}

/** Width of the guard band, dB: the sheet's budget for balances and for levels; no other rule has one. */
function guardOf(state: RunState, rule: RuleId): number {
  const { guard } = state.setup.sheet
  if (!guard.on) return 0
  if (rule === 'balance') return guard.balanceU
  return rule === 'level' || rule === 'meanLevel' ? guard.levelU : 0
}

/**
 * Strings for which more plucks can still show conformity: a reject rule of theirs is in its guard band. The mean
 * level concerns every string of the reference.
 */
export function stringsInGuardBand(state: RunState, evaluated: EvaluatedRun): number[] {
  if (!state.setup.sheet.guard.on) return []
  const strings = new Set<number>()
  for (const result of decideRun(state, evaluated)) {
    if (result.why !== 'inGuardBand' || result.onOutside !== 'reject') continue
    if (result.stringNo !== null) strings.add(result.stringNo)
    else evaluated.reference.members.forEach((member, i) => member && strings.add(i + 1))
  }
  return [...strings].sort((a, b) => b - a)
}

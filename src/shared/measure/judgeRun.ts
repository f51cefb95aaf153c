import type { RuleResult } from '../contract/measured.ts'
import type { RuleId } from '../contract/rules.ts'
import type { SheetRule } from '../contract/thresholds.ts'
import { patternInForce, type EvaluatedRun } from './evaluateRun.ts'
import { judgeRule } from './judgeRule.ts'
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
  return state.setup.sheet.rules.flatMap((rule) =>
    stringsOfRule(isPerElement(rule.rule)).map((stringNo) =>
      judgeOne(state, evaluated, noise, rule, stringNo),
    ),
  )
}

function judgeOne(
  state: RunState,
  evaluated: EvaluatedRun,
  noise: NoiseReadings,
  rule: SheetRule,
  stringNo: number | null,
): RuleResult {
  return judgeRule(rule, ruleFact(state, evaluated, noise, rule.rule, stringNo), {
    stringNo,
    guard: guardOf(state, rule.rule),
    patternMissing: PATTERN_RULES.includes(rule.rule) && patternInForce(state.setup.sheet) === null,
  })
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
  for (const result of judgeRun(state, evaluated)) {
    if (result.why !== 'inGuardBand' || result.onOutside !== 'reject') continue
    if (result.stringNo !== null) strings.add(result.stringNo)
    else evaluated.reference.members.forEach((member, i) => member && strings.add(i + 1))
  }
  return [...strings].sort((a, b) => b - a)
}

import type { RuleResult } from '../contract/measured.ts'
import type { SheetRule } from '../contract/thresholds.ts'
import { conformProbability } from './conformProbability.ts'
import { expandedUncertainty } from './expandedUncertainty.ts'
import type { SimulatedSpread } from './rangeStepUncertainty.ts'
import { unitOf } from './unitOf.ts'
import { combinedU, welchSatterthwaite, type UncertaintyPart } from './welchSatterthwaite.ts'

type Why = NonNullable<RuleResult['why']>

/** What a rule is judged on. */
export interface RuleFact {
  value: number | null
  /** the value is an upper bound */
  atMost: boolean
  n: number
  parts: UncertaintyPart[]
  byHand: boolean
  /** there is nothing to judge */
  notTested: 'notMeasurable' | 'notReached' | null
  /** there is something, but it is no sound reading */
  invalid: 'scatterTooLarge' | 'tooFewPlucks' | 'noReference' | 'noSignal' | 'disagreesWithState' | null
  /** why it cannot be within: a value outside its limits still is outside, any other is invalid */
  notWithin: 'disagreesWithState' | null
  /** outside whatever the value: the reason */
  outside: 'noSignal' | null
  /** the value is not known, but it is at least this */
  atLeast: number | null
  /** in place of `parts`: of a simulation, run when asked for */
  simulated: (() => Pick<SimulatedSpread, 'expandedOneSided' | 'shareUpTo'> | null) | null
}

export interface JudgeOptions {
  stringNo: number | null
  /** strip inside a limit in which the value does not show conformity, in the rule's unit; 0: simple acceptance */
  guard: number
  /** balance rules without a pattern in force: they advise, and nothing depends on them */
  patternMissing: boolean
}

/** A fact with nothing known, to be filled in. */
export const NO_FACT: RuleFact = {
  value: null,
  atMost: false,
  n: 0,
  parts: [],
  byHand: false,
  notTested: null,
  invalid: null,
  notWithin: null,
  outside: null,
  atLeast: null,
  simulated: null,
}

/** A rule's outcome without its numbers: all that a verdict needs. */
export type Decision = Pick<RuleResult, 'rule' | 'stringNo' | 'result' | 'onOutside' | 'required' | 'why'>

/**
 * Decides one rule. Written as 'inside', never as 'not outside': within is only a finite value inside its limits, or a
 * censored one wholly inside. A value between guarded and specified limit is outside, 'in the guard band'. Without a
 * pattern in force a balance rule only advises and nothing requires it.
 */
export function decideRule(rule: SheetRule, fact: RuleFact, options: JudgeOptions): Decision {
  const decided = decide(fact, rule, options.guard)
  const isUnsure = decided.result === 'within' && fact.notWithin !== null
  const { result, why } = isUnsure ? { result: 'invalid' as const, why: fact.notWithin } : decided
  return {
    rule: rule.rule,
    stringNo: options.stringNo,
    result,
    onOutside: options.patternMissing ? 'advise' : rule.onOutside,
    required: rule.required && !options.patternMissing,
    why: options.patternMissing && result === 'outside' ? 'patternNotSet' : why,
  }
}

/**
 * Judges one rule: its decision and the numbers behind it. margin is the distance to the nearer specified limit in the
 * rule's unit, negative outside; expandedU is one-sided for one limit, two-sided for two; pConform is the probability
 * that the true value lies inside (JCGM 106). What is not finite is null.
 */
export function judgeRule(rule: SheetRule, fact: RuleFact, options: JudgeOptions): RuleResult {
  const low = finiteOrNull(rule.low)
  const high = finiteOrNull(rule.high)
  const value = finiteOrNull(fact.value)
  const known = value !== null && !fact.atMost && (low !== null || high !== null)
  return {
    ...decideRule(rule, fact, options),
    unit: unitOf(rule.rule),
    value,
    atMost: value !== null && fact.atMost,
    n: fact.n,
    low,
    high,
    margin: marginOf(value, fact.atMost, low, high),
    ...(known ? confidenceOf(fact, value, low, high) : { expandedU: null, pConform: null }),
    byHand: fact.byHand,
  }
}

function confidenceOf(
  fact: RuleFact,
  value: number,
  low: number | null,
  high: number | null,
): Pick<RuleResult, 'expandedU' | 'pConform'> {
  if (fact.simulated !== null && low === null && high !== null) {
    const spread = fact.simulated()
    if (spread === null) return { expandedU: null, pConform: null }
    return { expandedU: finiteOrNull(spread.expandedOneSided), pConform: spread.shareUpTo(high) }
  }
  const u = fact.parts.length === 0 ? null : finiteOrNull(combinedU(fact.parts))
  const dof = welchSatterthwaite(fact.parts)
  const sides = low !== null && high !== null ? 2 : 1
  return {
    expandedU: expandedUncertainty(u, dof, sides),
    pConform: conformProbability(value, u, dof, low, high),
  }
}

function decide(
  fact: RuleFact,
  rule: SheetRule,
  guard: number,
): { result: RuleResult['result']; why: Why | null } {
  const low = finiteOrNull(rule.low)
  const high = finiteOrNull(rule.high)
  const value = finiteOrNull(fact.value)
  if (fact.notTested !== null) return { result: 'notTested', why: fact.notTested }
  if (fact.outside !== null) return { result: 'outside', why: fact.outside }
  if (fact.invalid !== null) return { result: 'invalid', why: fact.invalid }
  // a limit that is there but is no number would otherwise be no limit
  if (rule.low !== low || rule.high !== high) return { result: 'invalid', why: 'notFinite' }
  if (fact.atLeast !== null) return judgeAtLeast(fact.atLeast, high)
  if (value === null) return { result: 'invalid', why: 'notFinite' }
  if (unitOf(rule.rule) === 'yes/no') return judgeYesNo(value)
  // a limit that was forgotten must not let everything pass
  if (low === null && high === null) return { result: 'invalid', why: 'notFinite' }
  if (fact.atMost) return judgeCensored(value, low, high)
  if (!isInside(value, low, high, 0)) return { result: 'outside', why: 'beyondLimit' }
  if (!isInside(value, low, high, guard)) return { result: 'outside', why: 'inGuardBand' }
  return { result: 'within', why: null }
}

function judgeYesNo(value: number) {
  if (value === 1) return { result: 'within' as const, why: null }
  if (value === 0) return { result: 'outside' as const, why: 'beyondLimit' as const }
  return { result: 'invalid' as const, why: 'notFinite' as const }
}

/** 'At most': wholly inside needs an upper limit alone; wholly below the lower limit is outside. */
function judgeCensored(bound: number, low: number | null, high: number | null) {
  if (low !== null && bound < low) return { result: 'outside' as const, why: 'beyondLimit' as const }
  if (low === null && high !== null && bound <= high) return { result: 'within' as const, why: null }
  return { result: 'invalid' as const, why: 'censoredAcrossLimit' as const }
}

/** 'At least', with an upper limit: beyond it for sure, or not known. */
function judgeAtLeast(bound: number, high: number | null) {
  return high !== null && bound > high
    ? { result: 'outside' as const, why: 'noSignal' as const }
    : { result: 'invalid' as const, why: 'censoredAcrossLimit' as const }
}

/**
 * Whether a value lies inside its limits, each drawn in by the guard band. NaN is never inside; limits themselves are
 * inside. Without any limit nothing is inside: nothing was asked.
 *
 * @example isInside(2.5, -2.5, 2.5, 0) // true
 */
export function isInside(value: number, low: number | null, high: number | null, guard: number): boolean {
  if (low === null && high === null) return false
  return (
    (low === null || value >= low + guard) &&
    (high === null || value <= high - guard) &&
    Number.isFinite(value)
  )
}

function marginOf(
  value: number | null,
  atMost: boolean,
  low: number | null,
  high: number | null,
): number | null {
  if (value === null) return null
  const toLow = low === null ? Infinity : value - low
  const toHigh = high === null ? Infinity : high - value
  // of a bound only the side that it can reach is known
  const margin = atMost ? (low === null ? toHigh : value < low ? toLow : Infinity) : Math.min(toLow, toHigh)
  return finiteOrNull(margin)
}

function finiteOrNull(value: number | null | undefined): number | null {
  return value !== null && value !== undefined && Number.isFinite(value) ? value : null
}

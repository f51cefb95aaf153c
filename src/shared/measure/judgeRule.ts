import type { RuleResult } from '../contract/measured.ts'
import type { SheetRule } from '../contract/thresholds.ts'
import { conformProbability } from './conformProbability.ts'
import { expandedUncertainty } from './expandedUncertainty.ts'
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
  /** outside whatever the value: the reason */
  outside: 'noSignal' | null
  /** the value is not known, but it is at least this */
  atLeast: number | null
  /** of a simulation, in place of `parts` */
  simulated: { expandedOneSided: number; shareUpTo: (limit: number) => number } | null
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
  outside: null,
  atLeast: null,
  simulated: null,
}

/**
 * Judges one rule. Written as 'inside', never as 'not outside': within is only a finite value inside its limits, or a
 * censored one wholly inside. A value between guarded and specified limit is outside, 'in the guard band'. margin is
 * the distance to the nearer specified limit in the rule's unit, negative outside; expandedU is one-sided for one
 * limit, two-sided for two.
 */
export function judgeRule(rule: SheetRule, fact: RuleFact, options: JudgeOptions): RuleResult {
  const low = finiteOrNull(rule.low)
  const high = finiteOrNull(rule.high)
  const value = finiteOrNull(fact.value)
  const { result, why } = judge(fact, value, low, high, rule, options)
  const u = fact.parts.length === 0 ? null : finiteOrNull(combinedU(fact.parts))
  const dof = welchSatterthwaite(fact.parts)
  const single = (low === null) !== (high === null)
  const limited = low !== null || high !== null
  const shown = value !== null && !fact.atMost && limited
  return {
    rule: rule.rule,
    stringNo: options.stringNo,
    result,
    onOutside: options.patternMissing ? 'advise' : rule.onOutside,
    required: rule.required && !options.patternMissing,
    unit: unitOf(rule.rule),
    value,
    atMost: value !== null && fact.atMost,
    n: fact.n,
    low,
    high,
    margin: marginOf(value, fact.atMost, low, high),
    expandedU: shown
      ? (finiteOrNull(fact.simulated?.expandedOneSided) ?? expandedUncertainty(u, dof, single ? 1 : 2))
      : null,
    pConform: shown
      ? fact.simulated !== null && high !== null && low === null
        ? clamp(fact.simulated.shareUpTo(high))
        : conformProbability(value, u, dof, low, high)
      : null,
    why: options.patternMissing && result === 'outside' ? 'patternNotSet' : why,
    byHand: fact.byHand,
  }
}

function judge(
  fact: RuleFact,
  value: number | null,
  low: number | null,
  high: number | null,
  rule: SheetRule,
  options: JudgeOptions,
): { result: RuleResult['result']; why: Why | null } {
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
  if (!isInside(value, low, high, options.guard)) return { result: 'outside', why: 'inGuardBand' }
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

function clamp(probability: number): number {
  return Math.min(1, Math.max(0, probability))
}

import { AT_MOST, NO_VALUE, formatDb, formatLimits, formatMargin, formatU, formatValue } from './format.ts'
import type { LevelUnit } from './format.ts'
import type { RuleResult } from './shared/contract/measured.ts'
import type { Unit } from './shared/contract/quantities.ts'
import type { RunView } from './shared/contract/runs.ts'
import { WHYS, ruleName, stringText } from './texts.ts'

export interface Reason {
  /** one sentence for people */
  text: string
  /** the numbers behind it, in one line */
  detail: string
  result: RuleResult
}

/** Sentences of rules that are a state and not a number. */
const STATE_SENTENCES: Partial<Record<RuleResult['rule'], string>> = {
  switchOpen: 'Ring and sleeve are joined with the plug out: the preamp never switches off',
  switchClosed: 'Ring and sleeve stay open with the plug in: the preamp does not switch on',
  tipContinuity: 'The tip signal breaks',
}

const upperFirst = (text: string) => text.charAt(0).toUpperCase() + text.slice(1)

/** Why the verdict is what it is: what rejects first, then what kept a verdict from being given. */
export function verdictReasons(view: RunView, level: LevelUnit): Reason[] {
  const { results, verdict } = view.measured
  const rejecting = results.filter((r) => r.result === 'outside' && r.onOutside === 'reject')
  const missing = results.filter((r) => r.required && (r.result === 'invalid' || r.result === 'notTested'))
  const told = verdict === 'fail' ? rejecting : verdict === 'none' ? [...rejecting, ...missing] : []
  const silent = new Set(told.filter((r) => r.rule === 'speaks').map((r) => r.stringNo))
  return told
    .filter((r) => r.rule === 'speaks' || r.stringNo === null || !silent.has(r.stringNo))
    .map((result) => reasonOf(result, view, level))
}

/** What lies outside a rule that only advises. */
export function advice(view: RunView, level: LevelUnit): Reason[] {
  return view.measured.results
    .filter((r) => r.result === 'outside' && r.onOutside === 'advise')
    .map((result) => reasonOf(result, view, level))
}

export function reasonOf(result: RuleResult, view: RunView, level: LevelUnit): Reason {
  return { text: sentence(result, view, level), detail: detailOf(result), result }
}

function nameOf(result: RuleResult, view: RunView): string | null {
  if (result.stringNo === null) return null
  const name = view.setup.model.tuning[result.stringNo - 1]?.name ?? null
  return stringText(result.stringNo, name, view.setup.model.strings)
}

function sentence(result: RuleResult, view: RunView, level: LevelUnit): string {
  const which = nameOf(result, view)
  const subject = which
    ? `${upperFirst(which)}: ${ruleName(result.rule).toLowerCase()}`
    : ruleName(result.rule)
  if (result.result !== 'outside') {
    const what = which
      ? `${upperFirst(which)}, ${ruleName(result.rule).toLowerCase()}`
      : ruleName(result.rule)
    return `${what}: ${result.why ? WHYS[result.why] : 'no result'}`
  }
  if (result.rule === 'speaks') return `${upperFirst(which ?? 'a string')} gives no signal`
  const state = STATE_SENTENCES[result.rule]
  if (state) return state
  const { value, low, high, unit } = result
  if (value === null) return `${subject} is outside${result.why ? `: ${WHYS[result.why]}` : ''}`
  if (result.rule === 'balance' && which) return balanceSentence(upperFirst(which), result)
  if (result.rule === 'disturbanceCount') {
    return `The contact broke ${formatValue(value, unit)} ${value === 1 ? 'time' : 'times'} in the wiggle, limit ${formatValue(high, unit)}`
  }
  const signed = result.rule === 'meanLevel'
  const limit = limitText(low, high, unit, { signed, level })
  const bound = result.atMost ? `${AT_MOST} ` : ''
  return `${subject} is ${bound}${formatValue(value, unit, { signed, level })}, ${limit}`
}

/** 'limit 4.0 dB', or 'limits −4.0 to +4.0 dB' */
function limitText(
  low: number | null,
  high: number | null,
  unit: Unit,
  options: { signed: boolean; level: LevelUnit },
): string {
  if (low !== null && high !== null) return `limits ${formatLimits(low, high, unit, options)}`
  return `limit ${formatValue(low ?? high, unit, options)}`
}

/** 'String 4, D is 3.4 dB low, limit 2.5 dB' */
function balanceSentence(which: string, { value, low, high, atMost, why }: RuleResult): string {
  const isLow = value! < 0
  const limit = isLow ? low : high
  const by = `${atMost ? 'at least ' : ''}${formatDb(Math.abs(value!))}`
  const shown = why === 'inGuardBand' ? ', not shown to conform' : ''
  const limitShown = limit === null ? NO_VALUE : formatDb(Math.abs(limit))
  return `${which} is ${by} ${isLow ? 'low' : 'high'}, limit ${limitShown}${shown}`
}

function detailOf({ margin, expandedU, n, unit }: RuleResult): string {
  const parts = [
    margin === null || unit === 'yes/no' ? null : `margin ${formatMargin(margin, unit)}`,
    expandedU === null ? null : `U ${formatU(expandedU)}`,
    n > 0 && unit !== 'yes/no' ? `n ${n}` : null,
  ]
  return parts.filter((part) => part !== null).join(' \u00b7 ')
}

import type { RuleResult, Verdict } from '../contract/measured.ts'

/**
 * Verdict of a run, in this order: bench not verified or run stopped: none. Any reject rule outside: fail. Any
 * required rule invalid or not tested: none. Otherwise pass. No results at all give none: nothing was shown.
 */
export function verdictOf(
  results: readonly Pick<RuleResult, 'result' | 'onOutside' | 'required'>[],
  run: { verified: boolean; stopped: boolean },
): Verdict {
  if (!run.verified || run.stopped || results.length === 0) return 'none'
  if (results.some((r) => r.onOutside === 'reject' && r.result === 'outside')) return 'fail'
  const shown = (r: (typeof results)[number]) =>
    r.result === 'within' || (r.onOutside === 'advise' && r.result === 'outside')
  if (results.some((r) => r.required && !shown(r))) return 'none'
  return 'pass'
}

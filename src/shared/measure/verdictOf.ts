import type { RuleResult, Verdict } from '../contract/measured.ts'

/**
 * Verdict of a run, in this order: bench not verified or run stopped: none. Any reject rule outside: fail. Any
 * required rule invalid or not tested: none. No required reject rule within, as of a sheet that requires nothing:
 * none, nothing was shown. Otherwise pass.
 */
export function verdictOf(
  results: readonly Pick<RuleResult, 'result' | 'onOutside' | 'required'>[],
  run: { verified: boolean; stopped: boolean },
): Verdict {
  if (!run.verified || run.stopped) return 'none'
  if (results.some((r) => r.onOutside === 'reject' && r.result === 'outside')) return 'fail'
  const shown = (r: (typeof results)[number]) =>
    r.result === 'within' || (r.onOutside === 'advise' && r.result === 'outside')
  if (results.some((r) => r.required && !shown(r))) return 'none'
  const isShownToPass = results.some((r) => r.required && r.onOutside === 'reject' && r.result === 'within')
  return isShownToPass ? 'pass' : 'none'
}

import { capabilitiesCover } from '../../shared/measure/capabilitiesCover.ts'
import { isEnterableByHand } from '../../shared/measure/isEnterableByHand.ts'
import type { RunConditions } from '../../shared/contract/runs.ts'
import type { BenchView, ModelView } from '../../shared/contract/workshop.ts'
import { WARNINGS, ruleName, type TextPair } from '../../texts.ts'

/** Under this many minutes since stringing the levels may still move. */
export const FRESH_STRINGS_MINUTES = 10

/** What will keep the verdict from being given, or weaken it, said before anything is measured. */
export function startWarnings(
  bench: BenchView | null,
  model: ModelView | null,
  conditions: Pick<RunConditions, 'strungMinutes'>,
): TextPair[] {
  const warnings: TextPair[] = []
  if (bench && !bench.verified) warnings.push(WARNINGS.benchNotVerified)
  const sheet = model?.sheet
  if (bench && sheet) {
    const missing = sheet.rules.filter((entry) => !capabilitiesCover(entry.rule, bench.capabilities))
    const namesByHand = (required: boolean) =>
      missing
        .filter((entry) => isEnterableByHand(entry.rule) && entry.required === required)
        .map((entry) => ruleName(entry.rule))
    const asked = namesByHand(true)
    const offered = namesByHand(false)
    const never = missing
      .filter((entry) => !isEnterableByHand(entry.rule))
      .map((entry) => ruleName(entry.rule))
    if (asked.length > 0) {
      warnings.push({
        title: `This bench cannot measure: ${asked.join('; ')}.`,
        remedy: 'Have a meter ready; the readings are typed in at the end.',
      })
    }
    if (offered.length > 0) {
      warnings.push({
        title: `This bench cannot measure: ${offered.join('; ')}.`,
        remedy:
          'Not required. They may be typed in during the check, before the wiggle ends: \u2018Enter a reading by hand\u2019.',
      })
    }
    if (never.length > 0) {
      const isRequired = missing.some((entry) => entry.required && !isEnterableByHand(entry.rule))
      warnings.push({
        title: `Not tested on this bench: ${never.join('; ')}.`,
        remedy: isRequired ? 'It is required, so the verdict will be none.' : 'It is not required.',
      })
    }
    if (
      sheet.patternDb === null &&
      sheet.rules.some((entry) => ['balance', 'range', 'step'].includes(entry.rule))
    ) {
      warnings.push(WARNINGS.patternNotSet)
    }
  }
  if (conditions.strungMinutes !== null && conditions.strungMinutes < FRESH_STRINGS_MINUTES) {
    warnings.push(WARNINGS.stringsFresh)
  }
  return warnings
}

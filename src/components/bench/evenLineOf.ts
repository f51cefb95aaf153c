import { NO_VALUE, formatReading, type LevelUnit } from '../../format.ts'
import type { RunView } from '../../shared/contract/runs.ts'
import type { EvenLineProps } from '../runs/evenLine.ts'

/** What the even line shows of a run, live or from the shelf. */
export function evenLineOf(view: RunView, level: LevelUnit, captions = true): EvenLineProps {
  const { measured, setup } = view
  const band = setup.sheet.rules.find((entry) => entry.rule === 'balance')
  const resultOf = (stringNo: number) =>
    measured.results.find((r) => r.rule === 'balance' && r.stringNo === stringNo)?.result ?? null
  return {
    balancesDb: measured.strings.map((s) => s.balance.value),
    lowDb: band?.low ?? null,
    highDb: band?.high ?? null,
    handedness: setup.model.handedness,
    names: measured.strings.map((s) => s.name),
    captions: captions
      ? measured.strings.map((s) => (s.level.value === null ? NO_VALUE : formatReading(s.level, { level })))
      : undefined,
    states: measured.strings.map((s) => s.state),
    results: measured.strings.map((s) => resultOf(s.stringNo)),
    expandedU: measured.strings.map((s) => s.balance.expandedU),
    n: measured.strings.map((s) => (s.balance.value === null ? null : s.balance.n)),
    atMost: measured.strings.map((s) => s.balance.atMost),
    provisional: measured.provisional,
    activeStringNo: measured.phase === 'strings' ? measured.promptStringNo : null,
  }
}

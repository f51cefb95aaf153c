import type { MeasuredRun } from '../../src/shared/contract/measured.ts'
import type { Reading } from '../../src/shared/contract/quantities.ts'
import { RULES } from '../../src/shared/contract/rules.ts'

/** Largest difference between a balance and what sox expects of it, dB. */
const WITHIN_DB = 0.1

/** What a person wants to see of a run: six balances beside the expected ones, what was dropped, the verdict. */
export function resultLines(measured: MeasuredRun, expectedBalanceDb: readonly number[] | null): string[] {
  const head = ['string', 'plucks', 'level dBV', 'balance dB', 'U dB', 's dB']
  const rows = measured.strings.map(({ stringNo, name, accepted, level, balance, sDb }, i) => [
    `${stringNo} ${name}`,
    String(accepted),
    numberOf(level),
    signed(numberOf(balance)),
    balance.expandedU === null ? '-' : balance.expandedU.toFixed(2),
    sDb === null ? '-' : sDb.toFixed(2),
    ...(expectedBalanceDb ? comparison(balance, expectedBalanceDb[i]!) : []),
  ])
  const table = [[...head, ...(expectedBalanceDb ? ['expected dB', 'off dB'] : [])], ...rows]
  return [...aligned(table), '', ...droppedLines(measured), ...outsideLines(measured), verdictLine(measured)]
}

/** Every balance is there and within 0.10 dB of what is expected. */
export function isAsExpected(measured: MeasuredRun, expectedBalanceDb: readonly number[]): boolean {
  return measured.strings.every(
    ({ balance }, i) =>
      balance.value !== null &&
      !balance.atMost &&
      Math.abs(balance.value - expectedBalanceDb[i]!) <= WITHIN_DB,
  )
}

function comparison(balance: Reading, expectedDb: number): string[] {
  const off = balance.value === null ? '-' : signed((balance.value - expectedDb).toFixed(3))
  return [signed(expectedDb.toFixed(2)), off]
}

function numberOf({ value, atMost }: Reading): string {
  if (value === null) return '-'
  return `${atMost ? 'at most ' : ''}${value.toFixed(2)}`
}

function signed(text: string): string {
  return /^\d/.test(text) ? `+${text}` : text
}

function aligned(table: readonly (readonly string[])[]): string[] {
  const widths = table[0]!.map((_, column) => Math.max(...table.map((row) => row[column]!.length)))
  return table.map((row) => row.map((text, column) => text.padStart(widths[column]!)).join('  '))
}

function droppedLines({ plucks }: MeasuredRun): string[] {
  const dropped = plucks.filter((pluck) => pluck.dropped !== null)
  return dropped.map(
    (pluck) =>
      `Pluck ${pluck.no}${pluck.stringNo === null ? '' : ` of string ${pluck.stringNo}`} was dropped: ${pluck.dropped}.`,
  )
}

function outsideLines({ results }: MeasuredRun): string[] {
  return results
    .filter(({ result }) => result === 'outside' || result === 'invalid')
    .map(
      ({ rule, stringNo, result, why, onOutside }) =>
        `${RULES[rule].name}${stringNo === null ? '' : `, string ${stringNo}`}: ${result}` +
        `${why === null ? '' : ` (${why})`}${onOutside === 'advise' ? ', only advises' : ''}.`,
    )
}

function verdictLine({ verdict }: MeasuredRun): string {
  return `Verdict: ${verdict === null || verdict === 'none' ? 'no verdict' : verdict}`
}

import { describe, expect, test } from 'vitest'
import type { MeasuredRun } from '../../../src/shared/contract/measured.ts'
import type { RuleId } from '../../../src/shared/contract/rules.ts'
import { likelyCauses } from '../../../src/shared/measure/likelyCauses.ts'
import { aModel, aResult, aSheet, aString, reading } from '../../fixtures/runParts.ts'
import { sealedDeadString, sealedFail, sealedPass } from '../../fixtures/runViews.ts'

const sheet = aSheet()
const setup = { model: aModel() }
const keys = (measured: MeasuredRun, of = setup) => likelyCauses(measured, of).map((cause) => cause.key)

/** A run with these six balances, string 1 first, judged by the sheet's balance limits, and other rules outside. */
function withBalances(
  balances: number[],
  more: Partial<MeasuredRun> = {},
  alsoOutside: RuleId[] = [],
): MeasuredRun {
  const base = sealedPass().measured
  const strings = base.strings.map((s, i) => ({ ...s, balance: reading(balances[i]!, 'dB') }))
  const results = [
    ...balances.map((value, i) => aResult('balance', value, { sheet, stringNo: i + 1, n: 3 })),
    ...alsoOutside.map((rule) => aResult(rule, 1, { sheet, result: 'outside' as const })),
  ]
  return { ...base, strings, results, ...more }
}
const EVEN = [0, 0, 0, 0, 0, 0]
const allSilent = (more: Partial<MeasuredRun>): MeasuredRun => ({
  ...withBalances(EVEN),
  strings: sealedPass().measured.strings.map((s) =>
    aString({ stringNo: s.stringNo, name: s.name, state: 'silent' }),
  ),
  results: [1, 2, 3, 4, 5, 6].map((stringNo) => aResult('speaks', 0, { sheet, stringNo })),
  ...more,
})
const jack = sealedPass().measured.jack

describe('likelyCauses()', () => {
  test('names nothing when nothing is outside', () => {
    expect(likelyCauses(sealedPass().measured, setup)).toEqual([])
  })

  test('takes one dead string with five up 1.6 dB for an open element of a parallel strip', () => {
    const { measured } = sealedDeadString()
    expect(measured.meanLevel.value).toBeCloseTo(1.7, 1)
    const parallel = { model: aModel({ circuit: 'parallel' }) }
    expect(likelyCauses(measured, parallel)[0]).toEqual({ key: 'elementOpenParallel', stringNos: [4] })
    expect(keys(measured)[0]).toBe('elementOrChannelDead')
    expect(keys({ ...measured, meanLevel: reading(0.1, 'dB') }, parallel)[0]).toBe('elementOrChannelDead')
  })

  test('takes one low string for poor seating, and at an end of the strip for the strip end too', () => {
    expect(likelyCauses(withBalances([0, 0, 0, -4, 0, 0]), setup)).toEqual([
      { key: 'poorSeating', stringNos: [4] },
    ])
    expect(keys(withBalances([-4, 0.5, 0, 0, 0.5, 0]))).toEqual(['poorSeating', 'stripEnd'])
  })

  test('tells weak outer strings, weak middle strings and a slope apart', () => {
    expect(keys(withBalances([-4, 1, 1, 1, 1, -4]))).toEqual(['outerStringsWeak'])
    expect(keys(withBalances([1, 1, -4, -4, 1, 1]))).toEqual(['middleStringsWeak'])
    expect(likelyCauses(withBalances([-3, -2, -0.5, 0.5, 2, 3]), setup)).toEqual([
      { key: 'slope', stringNos: [1, 2] },
    ])
    expect(likelyCauses(withBalances([3, 2, 0.5, -0.5, -2, -3]), setup)).toEqual([
      { key: 'slope', stringNos: [5, 6] },
    ])
  })

  test('names no shape when a balance is missing or not finite', () => {
    expect(keys(withBalances([NaN, 1, 1, 1, 1, -4]))).toEqual([])
  })

  test('tells apart why all six are silent', () => {
    const supply = { pluggedMa: 0, unpluggedUa: 0, batteryV: 9 }
    expect(keys(allSilent({ supply, jack: { ...jack, pluggedClosed: true } }))).toEqual(['noPower'])
    const spent = [...allSilent({}).results, aResult('battery', 5.2, { sheet })]
    expect(keys(allSilent({ supply, jack: { ...jack, pluggedClosed: true }, results: spent }))).toEqual([
      'noPower',
    ])
    expect(keys(allSilent({ supply, jack: { ...jack, pluggedClosed: false } }))).toEqual(['ringNotClosed'])
    expect(keys(allSilent({ supply: { ...supply, pluggedMa: 3.8 } }))).toEqual(['stripShorted'])
    expect(
      keys(allSilent({ supply: { ...supply, pluggedMa: 3.8 }, jack: { ...jack, tipSteady: false } })),
    ).toEqual(['tipOpen'])
  })

  test('takes all six low for the controls, and with thin bass for a loaded input', () => {
    const low = { meanLevel: reading(-8, 'dB') }
    expect(keys(withBalances(EVEN, low, ['meanLevel']))).toEqual(['controlsNotSet'])
    expect(keys(withBalances([2, 2, 1, 0, -2, -3], low, ['meanLevel']))).toEqual(['inputLoading'])
  })

  test('takes hum before hiss, and names drop-outs, battery and current', () => {
    expect(keys(withBalances(EVEN, {}, ['noiseA', 'hum']))).toEqual(['hum'])
    expect(keys(withBalances(EVEN, {}, ['noiseA']))).toEqual(['hiss'])
    expect(keys(withBalances(EVEN, {}, ['battery', 'disturbanceLongest']))).toEqual([
      'batteryLow',
      'dropOuts',
    ])
    expect(keys(withBalances(EVEN, {}, ['currentUnplugged']))).toEqual(['poweredUnplugged'])
    const high = { ...withBalances(EVEN), results: [aResult('currentPlugged', 12, { sheet })] }
    expect(keys(high)).toEqual(['currentHigh'])
    const zero = { ...withBalances(EVEN), results: [aResult('currentPlugged', 0, { sheet })] }
    expect(keys({ ...zero, supply: { pluggedMa: 0, unpluggedUa: 0, batteryV: 9 } })).toEqual(['currentZero'])
  })

  test('gives at most three', () => {
    expect(keys(sealedFail().measured)).toEqual(['poorSeating', 'hum', 'dropOuts'])
    const many = withBalances([0, 0, 0, -4, 0, 0], {}, ['battery', 'hum', 'disturbanceCount', 'switchOpen'])
    expect(likelyCauses(many, setup)).toHaveLength(3)
  })
})

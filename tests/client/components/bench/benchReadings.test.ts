import { describe, expect, test } from 'vitest'
import { jackRows, noiseRows, supplyRows } from '../../../../src/components/bench/benchReadings.ts'
import { evenLineOf } from '../../../../src/components/bench/evenLineOf.ts'
import { liveAt, liveWithLowString, sealedFail } from '../../../fixtures/runViews.ts'

const plain = (rows: { name: string; value: string }[]) => rows.map((row) => `${row.name} ${row.value}`)

describe('noiseRows()', () => {
  test('shows A-weighted, hum and S/N at the bench, and marks what is outside', () => {
    expect(plain(noiseRows(sealedFail().measured, 'dBV', false))).toEqual([
      'A-weighted \u221291.4 dBV',
      'hum 50 Hz \u221268.3 dBV',
      'S/N A, worst 66.7 dB',
    ])
    expect(noiseRows(sealedFail().measured, 'dBV', true).map((row) => row.isOutside)).toEqual([
      false,
      false,
      true,
      false,
    ])
  })

  test('shows dashes before anything is measured', () => {
    expect(
      plain(noiseRows(liveAt('unplugged').measured, 'dBV', true)).every((row) => row.endsWith('\u2014')),
    ).toBe(true)
  })
})

describe('jackRows()', () => {
  test('follows the wiggle from not yet over its progress to what broke', () => {
    const wiggle = (measured: Parameters<typeof jackRows>[0]) =>
      jackRows(measured).find((row) => row.name === 'wiggle')!.value
    expect(wiggle(liveAt('strings').measured)).toBe('not yet')
    expect(wiggle(liveAt('wiggle').measured)).toBe('45 %')
    expect(wiggle(liveAt('entry').measured)).toBe('no breaks')
    expect(wiggle(sealedFail().measured)).toBe('4 breaks, 12.6 ms')
  })

  test('marks a switch that is open with the plug in', () => {
    const { measured } = liveAt('strings')
    const rows = jackRows({ ...measured, jack: { ...measured.jack, pluggedClosed: false } })
    expect(rows[1]).toEqual({ name: 'ring\u2013sleeve', value: 'open', isOutside: true })
  })
})

describe('supplyRows()', () => {
  test('has current plugged, unplugged and the battery', () => {
    expect(plain(supplyRows(liveAt('strings').measured))).toEqual([
      'plugged 3.80 mA',
      'unplugged 0.00 \u00b5A',
      'battery 8.90 V',
    ])
  })
})

describe('evenLineOf()', () => {
  test('is provisional with the level above each post while strings are to do', () => {
    const line = evenLineOf(liveWithLowString(), 'dBV')
    expect(line.provisional).toBe(true)
    expect(line.activeStringNo).toBe(4)
    expect(line.captions![3]).toBe('\u221224.7 dBV')
    expect(line.captions![0]).toBe('\u2014')
    expect(line.n).toEqual([null, null, null, 2, 3, 3])
    expect([line.lowDb, line.highDb]).toEqual([-2.5, 2.5])
  })

  test('takes the results of the balance rule when it is sealed', () => {
    const line = evenLineOf(sealedFail(), 'dBV')
    expect(line.results).toEqual(['within', 'within', 'within', 'outside', 'within', 'within'])
    expect(line.activeStringNo).toBeNull()
  })
})

import { expect, test } from 'vitest'
import {
  formatBalance,
  formatDateTime,
  formatDuration,
  formatLevel,
  formatLevelMdb,
  formatLimits,
  formatMargin,
  formatMohm,
  formatNumber,
  formatOhm,
  formatReading,
  formatShare,
  formatSigned,
  formatTimeOrDate,
  formatU,
  formatUa,
  formatValue,
} from '../../src/format.ts'
import { NOT_MEASURED_MDB, SILENCE_MDB } from '../../src/shared/contract/quantities.ts'

test('formatLevel() writes a true minus sign and the unit', () => {
  expect(formatLevel(-21.94)).toBe('\u221221.9 dBV')
})

test('formatLevel() gives dBu as the same level re 0.7746 V, 2.22 dB higher', () => {
  // 1 V rms is +2.2185 dBu: 20 lg(1 / sqrt(0.6))
  expect(formatLevel(0, 'dBu')).toBe('2.2 dBu')
  expect(formatLevel(-20, 'dBu', 3)).toBe('\u221217.782 dBu')
})

test('formatLevel() shows a dash for nothing, NaN and infinity', () => {
  for (const value of [null, undefined, NaN, -Infinity]) expect(formatLevel(value)).toBe('\u2014')
})

test('formatLevelMdb() tells silence from not measured', () => {
  expect(formatLevelMdb(-24_700)).toBe('\u221224.7 dBV')
  expect(formatLevelMdb(SILENCE_MDB)).toBe('silence')
  expect(formatLevelMdb(NOT_MEASURED_MDB)).toBe('\u2014')
})

test('formatNumber() never writes minus zero', () => {
  expect(formatNumber(-0.04)).toBe('0.0')
  expect(formatSigned(0.04)).toBe('0.0')
})

test('formatSigned() puts a sign before what is not zero', () => {
  expect([0.4, -0.6, 0].map((value) => formatSigned(value))).toEqual(['+0.4', '\u22120.6', '0.0'])
})

test('formatBalance() and formatU() write as the even line does', () => {
  expect(formatBalance(0.44)).toBe('+0.4 dB')
  expect(formatU(0.68)).toBe('\u00b10.7')
})

test('formatOhm() changes to milliohm below one ohm', () => {
  expect([0.0045, 0.1, 0.0318, 1, 47_000].map((ohm) => formatOhm(ohm))).toEqual([
    '4.5 m\u03a9',
    '100 m\u03a9',
    '32 m\u03a9',
    '1.00 \u03a9',
    '47.0 k\u03a9',
  ])
})

test('formatValue() has a unit for every unit of the contract', () => {
  expect(formatValue(3.8, 'mA')).toBe('3.80 mA')
  expect(formatUa(0.25)).toBe('0.25 \u00b5A')
  expect(formatUa(999.9)).toBe('999.90 \u00b5A')
  expect(formatUa(3800)).toBe('3.80 mA')
  expect(formatMohm(250)).toBe('250 M\u03a9')
  expect(formatValue(8.9, 'V')).toBe('8.90 V')
  expect(formatValue(12.34, 'ms')).toBe('12.3 ms')
  expect(formatValue(2, 'count')).toBe('2')
  expect([1, 0, null].map((value) => formatValue(value, 'yes/no'))).toEqual(['yes', 'no', '\u2014'])
})

test('formatReading() marks a censored reading', () => {
  expect(formatReading({ value: -78.2, atMost: true, unit: 'dBV' })).toBe('\u2264 \u221278.2 dBV')
  expect(formatReading({ value: null, atMost: true, unit: 'dBV' })).toBe('\u2014')
})

test('formatMargin() stays honest close to a limit', () => {
  expect(formatMargin(-0.004, 'dB')).toBe('\u22120.004 dB')
  expect(formatMargin(-0.9, 'dB')).toBe('\u22120.9 dB')
  expect(formatMargin(0, 'dB')).toBe('0.0 dB')
})

test('formatLimits() names one limit, both or none', () => {
  expect(formatLimits(-2.5, 2.5, 'dB', { signed: true })).toBe('\u22122.5 to +2.5 dB')
  expect(formatLimits(8, null, 'V')).toBe('at least 8.00 V')
  expect(formatLimits(null, 0.1, 'ohm')).toBe('at most 100 m\u03a9')
  expect(formatLimits(null, null, 'dB')).toBe('\u2014')
})

test('formatShare() does not round a near miss up to certainty', () => {
  expect(formatShare(0.9996)).toBe('> 99.9 %')
  expect(formatShare(1)).toBe('100 %')
  expect(formatShare(0.954)).toBe('95.4 %')
  expect(formatShare(0.0001)).toBe('< 0.1 %')
})

test('formatDuration() grows from tenths of a second to days', () => {
  expect([400, 32_000, 92_000, 7_500_000, 273_600_000].map((ms) => formatDuration(ms))).toEqual([
    '0.4 s',
    '32 s',
    '1 min 32 s',
    '2 h 05 min',
    '3 d 4 h',
  ])
  expect(formatDuration(-1)).toBe('\u2014')
})

test("formatDateTime() gives the workshop's own time", () => {
  expect(formatDateTime('2026-12-01T07:12:00.000Z', 'Europe/London')).toBe('01 Dec 2026 07:12')
  expect(formatDateTime('2026-09-01T23:30:00.000Z', 'Asia/Tokyo')).toBe('02 Sep 2026 08:30')
  expect(formatDateTime('2026-12-01T00:05:00.000Z', 'UTC')).toBe('01 Dec 2026 00:05')
  expect(formatDateTime('not a date', 'UTC')).toBe('\u2014')
})

test("formatTimeOrDate() leaves out today's date", () => {
  const now = Date.parse('2026-12-01T15:00:00.000Z')
  expect(formatTimeOrDate('2026-12-01T07:12:00.000Z', now, 'UTC')).toBe('07:12')
  expect(formatTimeOrDate('2026-11-30T07:12:00.000Z', now, 'UTC')).toBe('30 Nov 2026 07:12')
})

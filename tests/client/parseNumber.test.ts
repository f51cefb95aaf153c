import { describe, expect, test } from 'vitest'
import { parseNumber } from '../../src/parseNumber.ts'

describe('parseNumber()', () => {
  test.each([
    ['0,05', 0.05],
    ['0.05', 0.05],
    [' 46 ', 46],
    ['-3,4', -3.4],
    ['\u22123.4', -3.4],
    ['+2', 2],
    [',5', 0.5],
    ['12.', 12],
    ['0', 0],
  ])('reads %s', (text, value) => {
    expect(parseNumber(text)).toBe(value)
  })

  test.each([
    '',
    ' ',
    'abc',
    '1.234,5',
    '1,234.5',
    '1,2,3',
    '1e3',
    '0x10',
    'Infinity',
    '12 V',
    '--1',
    '.',
    ',',
  ])('refuses "%s"', (text) => {
    expect(parseNumber(text)).toBeNull()
  })
})

import { expect, test } from 'vitest'
import { safeNext } from '../../../src/router/safeNext.ts'

test('safeNext() goes back to a page of this application', () => {
  expect(safeNext('/runs/1?x=2')).toBe('/runs/1?x=2')
})

test('safeNext() never leaves for another site', () => {
  for (const next of [
    '//elsewhere.test',
    '/\\elsewhere.test',
    'https://elsewhere.test',
    'javascript:0',
    undefined,
    ['/x'],
  ])
    expect(safeNext(next)).toBe('/')
})

test('safeNext() does not lead round to the sign-in', () => {
  expect(safeNext('/sign-in?next=/check')).toBe('/')
})

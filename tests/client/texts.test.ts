import { expect, test } from 'vitest'
import { problemText, promptText, stringText } from '../../src/texts.ts'

test('promptText() names the string with its note', () => {
  expect(promptText('dampThenPluck', 4, 'D')).toBe('Damp, then pluck string 4, D')
})

test('promptText() speaks of courses on a 12-string', () => {
  expect(promptText('pluckAgain', 1, 'E', 'twelve')).toBe('Damp, then pluck course 1, E again')
})

test('promptText() asks for any string when none is named', () => {
  expect(promptText('dampThenPluck', null, null)).toBe('Damp, then pluck any string')
})

test('promptText() leaves a sentence without a string as it is', () => {
  expect(promptText('muteAll', null, null)).toBe('Mute all strings')
})

test('stringText() does without a note', () => {
  expect(stringText(3, null)).toBe('string 3')
})

test('problemText() knows the codes of the server and of the page', () => {
  expect(problemText('bench.busy').title).toBe('Another run is open on this bench.')
  expect(problemText('client.offline').title).toBe('The server does not answer.')
})

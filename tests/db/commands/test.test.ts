import { expect, test } from 'vitest'
import { countTests } from '../../../db/commands/test.js'

const file = (status: string, ...tests: string[]) => ({
  status,
  assertionResults: tests.map((each) => ({ status: each })),
})

test('countTests() adds up the files', () => {
  expect(
    countTests({
      testResults: [file('passed', 'passed', 'passed'), file('failed', 'passed', 'failed', 'failed')],
    }),
  ).toEqual({ passed: 3, failed: 2 })
})

test('countTests() counts a file that did not load as one failure', () => {
  expect(countTests({ testResults: [file('failed'), file('failed', 'passed')] })).toEqual({
    passed: 1,
    failed: 2,
  })
})

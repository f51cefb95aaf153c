import { mount } from '@vue/test-utils'
import { expect, test } from 'vitest'
import { ApiProblem } from '../../../../src/api/apiProblem.ts'
import ProblemNote from '../../../../src/components/common/ProblemNote.vue'
import { ERRORS } from '../../../../src/shared/contract/errors.ts'

const text = (facts: Record<string, string | number>, code: 'sign-in.wait' | 'bench.busy' = 'sign-in.wait') =>
  mount(ProblemNote, {
    props: { problem: new ApiProblem({ type: '', code, status: 429, ...ERRORS[code], facts }) },
  })
    .findAll('p')
    .map((line) => line.text())
    .join(' ')

test.each([
  [3, 'Wait 3 seconds, then try again.'],
  [1, 'Wait 1 second, then try again.'],
  [0.2, 'Wait 1 second, then try again.'],
  [2.4, 'Wait 3 seconds, then try again.'],
  [90, 'Wait 1 min 30 s, then try again.'],
])('a wait of %d s is said once, in whole seconds', (waitSeconds, sentence) => {
  expect(text({ waitSeconds })).toBe(`Too many tries just now. ${sentence}`)
})

test('a problem without a wait says what to do and by whom', () => {
  expect(text({ person: 'Bench hand', bench: 'Window' }, 'bench.busy')).toBe(
    `${ERRORS['bench.busy'].title} ${ERRORS['bench.busy'].remedy} By Bench hand. Bench Window.`,
  )
})

import { flushPromises } from '@vue/test-utils'
import { afterEach, beforeEach, expect, test, vi } from 'vitest'
import { effectScope, ref } from 'vue'
import type { EffectScope } from 'vue'
import { ApiProblem } from '../../../src/api/apiProblem.ts'
import { useLoad } from '../../../src/composables/useLoad.ts'
import { RETRY_AFTER_MS } from '../../../src/composables/useRetry.ts'

let scope: EffectScope
beforeEach(() => {
  vi.useFakeTimers()
  scope = effectScope()
})
afterEach(() => {
  scope.stop()
  vi.useRealTimers()
})

test('useLoad() fetches now and again when the source changes, and drops the late answer', async () => {
  const source = ref('a')
  const answers = new Map<string, (value: string) => void>()
  const load = vi.fn(
    (key: string, _signal: AbortSignal) => new Promise<string>((resolve) => answers.set(key, resolve)),
  )
  const loaded = scope.run(() => useLoad(() => source.value, load))!
  source.value = 'b'
  await flushPromises()
  expect(load.mock.calls[0]![1].aborted).toBe(true)
  answers.get('b')!('answer b')
  answers.get('a')!('answer a')
  await flushPromises()
  expect(loaded.data.value).toBe('answer b')
  expect(loaded.loading.value).toBe(false)
})

test('useLoad() keeps the last good answer while a newer one fails', async () => {
  const load = vi.fn().mockResolvedValueOnce('good').mockRejectedValueOnce(new ApiProblem('client.answer'))
  const loaded = scope.run(() => useLoad(() => 1, load))!
  await flushPromises()
  await loaded.reload()
  expect(loaded.data.value).toBe('good')
  expect(loaded.problem.value?.code).toBe('client.answer')
})

test('useLoad() asks again by itself as long as the server is out of reach', async () => {
  const load = vi
    .fn()
    .mockRejectedValueOnce(new ApiProblem('client.offline'))
    .mockRejectedValueOnce(new ApiProblem('client.offline'))
    .mockResolvedValueOnce('back')
  const loaded = scope.run(() => useLoad(() => 1, load))!
  await flushPromises()
  expect(loaded.problem.value?.code).toBe('client.offline')
  await vi.advanceTimersByTimeAsync(2 * RETRY_AFTER_MS)
  expect(load).toHaveBeenCalledTimes(3)
  expect(loaded.data.value).toBe('back')
  expect(loaded.problem.value).toBeNull()
})

test('useLoad() does not repeat what will not change by itself', async () => {
  const load = vi.fn().mockRejectedValue(new ApiProblem('client.answer'))
  scope.run(() => useLoad(() => 1, load))
  await flushPromises()
  await vi.advanceTimersByTimeAsync(10 * RETRY_AFTER_MS)
  expect(load).toHaveBeenCalledOnce()
})

test('useLoad() stops with its scope', async () => {
  const load = vi.fn().mockRejectedValue(new ApiProblem('client.offline'))
  scope.run(() => useLoad(() => 1, load))
  await flushPromises()
  scope.stop()
  await vi.advanceTimersByTimeAsync(10 * RETRY_AFTER_MS)
  expect(load).toHaveBeenCalledOnce()
})

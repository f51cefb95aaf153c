import { afterEach, beforeEach, describe, expect, test, vi } from 'vitest'
import { effectScope, nextTick, ref, shallowRef } from 'vue'
import { NOTICE_MS, useBenchNotice, type BenchStep } from '../../../src/composables/useBenchNotice.ts'
import type { LastPluck } from '../../../src/stores/live.ts'
import { aPluck } from '../../fixtures/runParts.ts'

beforeEach(() => void vi.useFakeTimers())
afterEach(() => void vi.useRealTimers())

function started() {
  const lastPluck = shallowRef<LastPluck | null>(null)
  const counts = ref({ accepted: 1, wanted: 3 })
  const step = ref<BenchStep>({ phase: 'strings', stringNo: 4 })
  const scope = effectScope()
  const made = scope.run(() =>
    useBenchNotice(
      lastPluck,
      () => 'String',
      () => counts.value,
      () => step.value,
    ),
  )!
  let count = 0
  const pluck = async (over: Parameters<typeof aPluck>[0]) => {
    count += 1
    lastPluck.value = { stringNo: over.stringNo, pluck: aPluck(over), count }
    await nextTick()
  }
  return { ...made, pluck, counts, step, scope }
}

describe('useBenchNotice()', () => {
  test('says which string was dropped and why, for some seconds', async () => {
    const { notice, pluck, scope } = started()
    await pluck({ no: 1, stringNo: 4, onsetFrame: 10, dropped: 'notDamped' })
    expect(notice.value).toEqual({
      text: 'String 4 dropped. Another string still rang. Damp all first.',
      tone: 'attention',
    })
    await vi.advanceTimersByTimeAsync(NOTICE_MS - 1)
    expect(notice.value).not.toBeNull()
    await vi.advanceTimersByTimeAsync(1)
    expect(notice.value).toBeNull()
    scope.stop()
  })

  test('counts a kept pluck with the state that comes after it', async () => {
    const { notice, pluck, counts, scope } = started()
    await pluck({ no: 1, stringNo: 4, onsetFrame: 10 })
    expect(notice.value).toEqual({ text: 'String 4 heard, 1 of 3.', tone: 'quiet' })
    counts.value = { accepted: 2, wanted: 3 }
    expect(notice.value!.text).toBe('String 4 heard, 2 of 3.')
    scope.stop()
  })

  test('begins its seconds again with the next pluck, and tells one without a string', async () => {
    const { notice, pluck, scope } = started()
    await pluck({ no: 1, stringNo: 4, onsetFrame: 10 })
    await vi.advanceTimersByTimeAsync(NOTICE_MS - 100)
    await pluck({ no: 2, stringNo: null, onsetFrame: 90, dropped: 'strum' })
    await vi.advanceTimersByTimeAsync(NOTICE_MS - 100)
    expect(notice.value!.text).toBe('Pluck dropped. Two strings at once. Pluck one.')
    scope.stop()
  })

  test('does not count before the first kept pluck is in, and takes an extra one calmly', async () => {
    const { notice, pluck, counts, scope } = started()
    counts.value = { accepted: 0, wanted: 3 }
    await pluck({ no: 1, stringNo: 4, onsetFrame: 10 })
    expect(notice.value).toEqual({ text: 'String 4 heard.', tone: 'quiet' })
    await pluck({ no: 2, stringNo: 6, onsetFrame: 90, dropped: 'stringDone' })
    expect(notice.value).toEqual({ text: 'String 6 was done already. Nothing changes.', tone: 'quiet' })
    scope.stop()
  })

  test('clears at once when the phase or the asked string changes', async () => {
    const { notice, pluck, step, say, scope } = started()
    await pluck({ no: 1, stringNo: 4, onsetFrame: 10, dropped: 'clipped' })
    step.value = { phase: 'strings', stringNo: 3 }
    expect(notice.value).toBeNull()
    say('Each string can be repeated once only.')
    step.value = { phase: 'wiggleReady', stringNo: null }
    expect(notice.value).toBeNull()
    scope.stop()
  })

  test('keeps a line about the string that is asked for next', () => {
    const { notice, step, say, scope } = started()
    say('String 6 set aside. Pluck it again.', { tone: 'quiet', stringNo: 6 })
    step.value = { phase: 'strings', stringNo: 6 }
    expect(notice.value!.text).toBe('String 6 set aside. Pluck it again.')
    step.value = { phase: 'strings', stringNo: 5 }
    expect(notice.value).toBeNull()
    scope.stop()
  })
})

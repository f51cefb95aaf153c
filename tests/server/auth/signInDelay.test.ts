import { describe, expect, it } from 'vitest'
import {
  FORGET_AFTER_MS,
  FREE_FAILURES,
  LONGEST_WAIT_SECONDS,
  countingFailures,
  waitSeconds,
} from '../../../server/auth/signInDelay.ts'

const at = new Date('2026-03-04T09:00:00.000Z')
const later = (ms: number) => new Date(at.getTime() + ms)
const after = (failures: number) => ({ failures, lastFailedAt: at })

describe('waitSeconds()', () => {
  it('costs nothing before the free failures are used up', () => {
    expect(waitSeconds('account', null, at)).toBe(0)
    expect(waitSeconds('account', after(FREE_FAILURES.account - 1), at)).toBe(0)
    expect(waitSeconds('address', after(FREE_FAILURES.address - 1), at)).toBe(0)
  })

  it('doubles from one second on', () => {
    const waits = [0, 1, 2, 3, 4, 5].map((more) =>
      waitSeconds('account', after(FREE_FAILURES.account + more), at),
    )
    expect(waits).toEqual([1, 2, 4, 8, 16, 32])
  })

  it('never exceeds 60 s, however many failures there were', () => {
    expect(waitSeconds('account', after(9), at)).toBe(LONGEST_WAIT_SECONDS)
    expect(waitSeconds('account', after(1_000_000), at)).toBe(LONGEST_WAIT_SECONDS)
  })

  it('runs down while time passes and rounds up to whole seconds', () => {
    expect(waitSeconds('account', after(8), later(500))).toBe(32)
    expect(waitSeconds('account', after(8), later(31_001))).toBe(1)
    expect(waitSeconds('account', after(8), later(32_000))).toBe(0)
  })

  it('forgets failures after an hour without another', () => {
    expect(countingFailures(after(20), later(FORGET_AFTER_MS))).toBe(20)
    expect(countingFailures(after(20), later(FORGET_AFTER_MS + 1))).toBe(0)
  })
})

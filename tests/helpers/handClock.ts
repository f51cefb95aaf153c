import type { Clock } from '../../simulator/bench/clock.ts'

/** A clock that stands still until a test moves it. */
export interface HandClock extends Clock {
  advance(ms: number): void
}

export function makeHandClock(): HandClock {
  let now = 0
  let waiting: { atMs: number; work: () => void }[] = []
  return {
    nowMs: () => now,
    wallClock: () => new Date(Date.UTC(2026, 11, 1, 8) + now),
    after(delayMs, work) {
      const entry = { atMs: now + delayMs, work }
      waiting.push(entry)
      return () => {
        waiting = waiting.filter((each) => each !== entry)
      }
    },
    advance(ms) {
      const end = now + ms
      for (;;) {
        const next = waiting.filter((each) => each.atMs <= end).sort((a, b) => a.atMs - b.atMs)[0]
        if (!next) break
        waiting = waiting.filter((each) => each !== next)
        now = Math.max(now, next.atMs)
        next.work()
      }
      now = end
    },
  }
}

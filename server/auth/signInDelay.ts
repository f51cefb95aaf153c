/** Failures that cost no wait: an account's owner may mistype, an address may be a terminal of many people. */
export const FREE_FAILURES = { account: 3, known: 3, address: 10 } as const
export type AttemptKind = keyof typeof FREE_FAILURES

export const LONGEST_WAIT_SECONDS = 60
/** Failures older than this count no more. */
export const FORGET_AFTER_MS = 60 * 60_000

export interface Attempts {
  failures: number
  lastFailedAt: Date
}

/** Failures that still count at `now`. */
export function countingFailures(attempts: Attempts | null, now: Date): number {
  if (!attempts || now.getTime() - attempts.lastFailedAt.getTime() > FORGET_AFTER_MS) return 0
  return attempts.failures
}

/**
 * Whole seconds to wait before the next try: 1 s after the last free failure, doubling, at most 60 s. A try that is
 * refused for this reason does not count, so waiting always helps.
 */
export function waitSeconds(kind: AttemptKind, attempts: Attempts | null, now: Date): number {
  const failures = countingFailures(attempts, now)
  if (!attempts || failures < FREE_FAILURES[kind]) return 0
  const delaySeconds = Math.min(LONGEST_WAIT_SECONDS, 2 ** (failures - FREE_FAILURES[kind]))
  const openAtMs = attempts.lastFailedAt.getTime() + delaySeconds * 1000
  return Math.max(0, Math.ceil((openAtMs - now.getTime()) / 1000))
}

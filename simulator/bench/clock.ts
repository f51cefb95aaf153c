/** Time as the bench client needs it; injected so that a test can hold it still. */
export interface Clock {
  /** monotonic, ms */
  nowMs(): number
  wallClock(): Date
  /** calls back once after a time; the answer calls it off */
  after(delayMs: number, work: () => void): () => void
}

export const systemClock: Clock = {
  nowMs: () => performance.now(),
  wallClock: () => new Date(),
  after(delayMs, work) {
    const timer = setTimeout(work, delayMs)
    return () => {
      clearTimeout(timer)
    }
  },
}

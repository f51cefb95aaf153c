/** Frames that start at or after a time: the time in ms, whole frames, rounded up. */
export function framesOf(ms: number, frameMs: number): number {
  return Math.ceil(ms / frameMs)
}

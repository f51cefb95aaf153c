/** A frame of even noise may stand this far above the median of its stretch; a touch or a pluck stands higher. */
const PEAK_MDB = 10_000
/** Both halves of a quiet stretch are alike; those of a string that dies away are not. */
const DRIFT_MDB = 2_000

/** Tells when every channel has been quiet and even for a whole stretch; said again every so often while it lasts. */
export class QuietStretch {
  private readonly levels: number[][]
  private readonly length: number
  private readonly every: number
  private readonly retry: number
  private wait = 0

  constructor(channels: number, lengthFrames: number, everyFrames: number) {
    this.levels = Array.from({ length: channels }, () => [])
    this.length = Math.round(lengthFrames)
    this.every = Math.max(1, Math.round(everyFrames))
    this.retry = Math.max(1, Math.round(everyFrames / 5))
  }

  /** Takes the next frame's levels; true if the stretch that ends with it was quiet. */
  push(levelsMdb: readonly number[]): boolean {
    this.levels.forEach((levels, channel) => {
      levels.push(levelsMdb[channel]!)
      if (levels.length > this.length) levels.shift()
    })
    if (this.levels[0]!.length < this.length || --this.wait > 0) return false
    const quiet = this.levels.every(isEven)
    this.wait = quiet ? this.every : this.retry
    return quiet
  }
}

function isEven(levels: readonly number[]): boolean {
  const half = levels.length >> 1
  const whole = median(levels)
  if (levels.some((level) => level > whole + PEAK_MDB)) return false
  return Math.abs(median(levels.slice(0, half)) - median(levels.slice(half))) <= DRIFT_MDB
}

function median(levels: readonly number[]): number {
  return [...levels].sort((a, b) => a - b)[levels.length >> 1]!
}

import { NOT_MEASURED_MDB, SILENCE_MDB } from '../../src/shared/contract/quantities.ts'
import type { FrameMs } from '../../src/shared/contract/frames.ts'

const FLOOR_FROM_MS = 200
const FLOOR_TO_MS = 40
/** Rise above the channel's own floor that makes an onset, as the measuring defines it. */
const RISE_MDB = 10_000

/**
 * Tells when a channel begins to sound: the first frame 10 dB above the median of the frames 200 to 40 ms before it.
 * Only says when to look for a pitch; what counts as a pluck is decided where the run is measured.
 */
export class OnsetDetector {
  private readonly levels: number[] = []
  private readonly most: number
  private readonly until: number
  private readonly lowestMdb: number
  private above = false

  /** `lowestMdb`: no floor is taken to be lower than this, so that digital silence is not a floor. */
  constructor(frameMs: FrameMs, lowestMdb: number) {
    this.most = FLOOR_FROM_MS / frameMs
    this.until = (FLOOR_FROM_MS - FLOOR_TO_MS) / frameMs
    this.lowestMdb = lowestMdb
  }

  /** Takes the next frame's level; true if the channel begins to sound in it. */
  push(levelMdb: number): boolean {
    const value = levelMdb === SILENCE_MDB || levelMdb === NOT_MEASURED_MDB ? this.lowestMdb : levelMdb
    const above = this.levels.length === this.most && value >= this.floorMdb() + RISE_MDB
    const begins = above && !this.above
    this.above = above
    this.levels.push(value)
    if (this.levels.length > this.most) this.levels.shift()
    return begins
  }

  private floorMdb(): number {
    const sorted = this.levels.slice(0, this.until).sort((a, b) => a - b)
    const middle = sorted.length / 2
    const median = (sorted[Math.ceil(middle) - 1]! + sorted[Math.floor(middle)]!) / 2
    return Math.max(median, this.lowestMdb)
  }
}

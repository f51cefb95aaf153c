import { NOT_MEASURED_MDB, SILENCE_MDB } from '../../src/shared/contract/quantities.ts'
import type { FrameMs } from '../../src/shared/contract/frames.ts'

const FLOOR_FROM_MS = 200
const FLOOR_TO_MS = 40
/** Rise above the channel's own floor that makes an onset, as the measuring defines it. */
const RISE_MDB = 10_000

/** A string that still rings is excited again: two frames running stand this far over the last moment. */
const AGAIN_MDB = 4_000
const AGAIN_FROM_MS = 60
const AGAIN_TO_MS = 20
/** Until then a rise is still the attack of the last onset. */
const ATTACK_MS = 80

/**
 * Tells when a channel begins to sound: the first frame 10 dB above the median of the frames 200 to 40 ms before it,
 * or a clear rise on top of what still rings. Only says when to look for a pitch; what counts as a pluck is decided where the run is measured.
 */
export class OnsetDetector {
  private readonly levels: number[] = []
  private readonly most: number
  private readonly until: number
  private readonly lowestMdb: number
  private readonly againFrom: number
  private readonly againTo: number
  private above = false
  private rising = false
  private readonly attackFrames: number
  private sinceOnset = Infinity

  /** `lowestMdb`: no floor is taken to be lower than this, so that digital silence is not a floor. */
  constructor(frameMs: FrameMs, lowestMdb: number) {
    this.most = FLOOR_FROM_MS / frameMs
    this.until = (FLOOR_FROM_MS - FLOOR_TO_MS) / frameMs
    this.againFrom = AGAIN_FROM_MS / frameMs
    this.againTo = AGAIN_TO_MS / frameMs
    this.attackFrames = ATTACK_MS / frameMs
    this.lowestMdb = lowestMdb
  }

  /** Takes the next frame's level; true if the channel begins to sound in it, or sounds anew. */
  push(levelMdb: number): boolean {
    const heard = levelMdb !== SILENCE_MDB && levelMdb !== NOT_MEASURED_MDB
    const value = heard ? Math.max(levelMdb, this.lowestMdb) : this.lowestMdb
    const full = this.levels.length === this.most
    const above = full && value >= this.lowestMdb + RISE_MDB && value >= this.floorMdb() + RISE_MDB
    const rising = full && this.risesBy(Math.min(value, this.levels.at(-1)!))
    const again = rising && !this.rising && this.sinceOnset >= this.attackFrames
    const begins = (above && !this.above) || again
    this.sinceOnset = begins ? 0 : this.sinceOnset + 1
    this.above = above
    this.rising = rising
    this.levels.push(value)
    if (this.levels.length > this.most) this.levels.shift()
    return begins
  }

  private floorMdb(): number {
    return medianOf(this.levels.slice(0, this.until))
  }

  private risesBy(valueMdb: number): boolean {
    if (valueMdb < this.lowestMdb + RISE_MDB) return false
    const count = this.levels.length
    return valueMdb >= medianOf(this.levels.slice(count - this.againFrom, count - this.againTo)) + AGAIN_MDB
  }
}

function medianOf(levels: number[]): number {
  levels.sort((a, b) => a - b)
  const middle = levels.length / 2
  return (levels[Math.ceil(middle) - 1]! + levels[Math.floor(middle)]!) / 2
}

import { NOT_MEASURED_MDB, SILENCE_MDB } from '../../src/shared/contract/quantities.ts'

const BLOCK_MS = 200
/** Loudest and quietest block of a quiet stretch are this close; those of a string that dies away are not. */
const SPREAD_DB = 3

/** Tells when every channel has been even for a whole stretch; said again every so often while it lasts. */
export class QuietStretch {
  private readonly blockFrames: number
  private readonly blocks: number
  private readonly everyBlocks: number
  /** energy of the blocks of each channel, the oldest first */
  private readonly energies: number[][]
  private readonly current: number[]
  private frames = 0
  private wait = 0

  constructor(channels: number, frameMs: number, stretchMs: number, everyMs: number) {
    this.blockFrames = BLOCK_MS / frameMs
    this.blocks = Math.ceil(stretchMs / BLOCK_MS)
    this.everyBlocks = Math.max(1, Math.round(everyMs / BLOCK_MS))
    this.energies = Array.from({ length: channels }, () => [])
    this.current = Array.from({ length: channels }, () => 0)
  }

  /** Takes the next frame's levels; true if the stretch that ends with it was even. */
  push(levelsMdb: readonly number[]): boolean {
    for (let channel = 0; channel < this.current.length; channel++)
      this.current[channel] = this.current[channel]! + energyOf(levelsMdb[channel]!)
    if (++this.frames % this.blockFrames !== 0) return false
    this.energies.forEach((energies, channel) => {
      energies.push(this.current[channel]!)
      this.current[channel] = 0
      if (energies.length > this.blocks) energies.shift()
    })
    if (this.energies[0]!.length < this.blocks || --this.wait > 0) return false
    const even = this.energies.every(
      (energies) => Math.max(...energies) <= Math.min(...energies) * 10 ** (SPREAD_DB / 10),
    )
    if (even) this.wait = this.everyBlocks
    return even
  }
}

function energyOf(levelMdb: number): number {
  return levelMdb === SILENCE_MDB || levelMdb === NOT_MEASURED_MDB ? 0 : 10 ** (levelMdb / 10_000)
}

import type { BenchEvent, ChannelKind } from '../../src/shared/contract/frames.ts'
import { mdbOfPower } from './benchInput.ts'
import { JACK } from './circuit.ts'
import { BAND_HIGH_HZ } from './noisePhysics.ts'
import type { Random } from './random.ts'

const EVERY_MS = 500
const LEAST_STRETCH_MS = 2000
/** Mains lines up to 1 kHz, and the noise bandwidth of one line against 1 / stretch (Hann window). */
const LINES = 20
const LINE_BANDWIDTH = 1.5

export interface HumAtPoint {
  power: number
  /** broadband noise at the same point, which the lines stand in */
  noisePower: number
}

/** Tells the hum of the last quiet stretch twice a second, as long as it stays quiet. */
export class HumReports {
  private readonly points: readonly number[]
  private readonly frameMs: number
  private readonly mainsHz: 50 | 60
  private readonly random: Random
  private stretchFrames = 0
  private quietFrames = 0

  constructor(channelKind: ChannelKind, frameMs: number, mainsHz: 50 | 60, random: Random) {
    this.points = channelKind === 'six' ? [JACK, 0, 1, 2, 3, 4, 5] : [JACK]
    this.frameMs = frameMs
    this.mainsHz = mainsHz
    this.random = random
  }

  restart(noiseStretchMs: number): void {
    this.stretchFrames = Math.ceil(Math.max(LEAST_STRETCH_MS, noiseStretchMs) / this.frameMs)
    this.quietFrames = 0
  }

  report(frameNo: number, events: BenchEvent[], still: boolean, humAt: (point: number) => HumAtPoint): void {
    this.quietFrames = still ? this.quietFrames + 1 : 0
    const over = this.quietFrames - this.stretchFrames
    if (over < 0 || over % (EVERY_MS / this.frameMs) !== 0) return
    const stretchS = (this.stretchFrames * this.frameMs) / 1000
    for (const point of this.points) {
      const { power, noisePower } = humAt(point)
      const density = noisePower / BAND_HIGH_HZ
      const spread = density * (LINE_BANDWIDTH / stretchS) * Math.sqrt(2 * LINES)
      // below its resolution the bench tells the resolution
      const read = Math.max(power + spread * this.random.normal(), 0.1 * spread)
      events.push({
        kind: 'hum',
        frame: frameNo,
        startTenthMs: (frameNo + 1 - this.stretchFrames) * this.frameMs * 10,
        durationTenthMs: this.stretchFrames * this.frameMs * 10,
        channel: point === JACK ? 0 : point + 1,
        mainsHz: this.mainsHz,
        levelMdb: mdbOfPower(read),
      })
    }
  }
}

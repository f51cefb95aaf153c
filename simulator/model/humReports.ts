import type { BenchEvent, ChannelKind } from '../../src/shared/contract/frames.ts'
import { mdbOfPower } from './benchInput.ts'
import { JACK } from './circuit.ts'
import type { Random } from './random.ts'

const EVERY_MS = 500
const LEAST_STRETCH_MS = 2000
/** Mains lines up to 1 kHz, and the noise bandwidth of one line against 1 / stretch (Hann window). */
const LINES = 20
const LINE_BANDWIDTH = 1.5

export interface HumAtPoint {
  power: number
  /** noise density around the lines, V^2 per Hz */
  density: number
}

export interface HumReports {
  report(frameNo: number, events: BenchEvent[], still: boolean, humAt: (point: number) => HumAtPoint): void
  restart(noiseStretchMs: number): void
}

/** Tells the hum of the last quiet stretch twice a second, as long as it stays quiet. */
export function makeHumReports(
  channelKind: ChannelKind,
  frameMs: number,
  mainsHz: 50 | 60,
  random: Random,
): HumReports {
  const points = channelKind === 'six' ? [JACK, 0, 1, 2, 3, 4, 5] : [JACK]
  const everyFrames = EVERY_MS / frameMs
  let stretchFrames = 0
  let quietFrames = 0

  return {
    restart(noiseStretchMs) {
      stretchFrames = Math.ceil(Math.max(LEAST_STRETCH_MS, noiseStretchMs) / frameMs)
      quietFrames = 0
    },
    report(frameNo, events, still, humAt) {
      quietFrames = still ? quietFrames + 1 : 0
      if (quietFrames < stretchFrames || (quietFrames - stretchFrames) % everyFrames !== 0) return
      const stretchS = (stretchFrames * frameMs) / 1000
      for (const point of points) {
        const { power, density } = humAt(point)
        const spread = density * (LINE_BANDWIDTH / stretchS) * Math.sqrt(2 * LINES)
        // below its resolution the bench tells the resolution
        const read = Math.max(power + spread * random.normal(), 0.1 * spread)
        events.push({
          kind: 'hum',
          frame: frameNo,
          startTenthMs: (frameNo + 1 - stretchFrames) * frameMs * 10,
          durationTenthMs: stretchFrames * frameMs * 10,
          channel: point === JACK ? 0 : point + 1,
          mainsHz,
          levelMdb: mdbOfPower(read),
        })
      }
    },
  }
}

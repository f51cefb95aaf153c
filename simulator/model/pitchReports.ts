import type { BenchEvent, ChannelKind } from '../../src/shared/contract/frames.ts'
import { JACK } from './circuit.ts'
import type { Tuning } from './circuit.ts'
import type { Random } from './random.ts'

/** A pitch is told so long after the pluck, from a stretch that begins a little after it, ms. */
const REPORT_AFTER_MS = 200
const STRETCH_FROM_MS = 70
const STRETCH_MS = 120
/** A string stands out when it is so much louder than the noise, or not so much softer than another string. */
const LEAST_RATIO = 10
const OTHER_RATIO = 16
/** Standard deviation of a pitch: about a cent. */
const PITCH_SPREAD = 0.0006

export interface PitchReports {
  expect(stringNo: number, frameNo: number, startTenthMs: number): void
  report(
    frameNo: number,
    events: BenchEvent[],
    powerAt: (stringNo: number, point: number) => number,
    noiseAt: (point: number) => number,
    tuning: Tuning,
  ): void
  restart(): void
}

/** Tells the pitch of each pluck as a bench would: late, a little off, and only when the string can be heard. */
export function makePitchReports(channelKind: ChannelKind, frameMs: number, random: Random): PitchReports {
  let waiting: { stringNo: number; dueFrame: number; startTenthMs: number }[] = []
  const points = channelKind === 'six' ? [0, 1, 2, 3, 4, 5] : [JACK]

  function loudestPoint(powerAt: (point: number) => number): number {
    return points.reduce((best, point) => (powerAt(point) > powerAt(best) ? point : best), points[0]!)
  }

  return {
    expect(stringNo, frameNo, startTenthMs) {
      waiting = waiting.filter((each) => each.stringNo !== stringNo)
      waiting.push({ stringNo, dueFrame: frameNo + Math.ceil(REPORT_AFTER_MS / frameMs), startTenthMs })
    },
    restart() {
      waiting = []
    },
    report(frameNo, events, powerAt, noiseAt, tuning) {
      if (waiting.length === 0) return
      const due = waiting.filter((each) => each.dueFrame <= frameNo)
      if (due.length === 0) return
      waiting = waiting.filter((each) => each.dueFrame > frameNo)
      for (const { stringNo, startTenthMs } of due) {
        const point = loudestPoint((at) => powerAt(stringNo, at))
        const own = powerAt(stringNo, point)
        let heardNo = stringNo
        let heard = own
        for (let other = 1; other <= 6; other++) {
          const power = powerAt(
            other,
            loudestPoint((at) => powerAt(other, at)),
          )
          if (power > own * OTHER_RATIO && power > heard) {
            heardNo = other
            heard = power
          }
        }
        const ratio = heard / noiseAt(point)
        if (!(ratio >= LEAST_RATIO)) continue
        events.push({
          kind: 'pitch',
          frame: frameNo,
          startTenthMs: startTenthMs + STRETCH_FROM_MS * 10,
          durationTenthMs: STRETCH_MS * 10,
          channel: point === JACK ? 0 : point + 1,
          milliHz: Math.round(tuning[heardNo - 1]! * 1000 * (1 + PITCH_SPREAD * random.normalWithin(3))),
          confidencePercent: Math.min(99, Math.round(100 * (1 - 1 / Math.sqrt(ratio)))),
        })
      }
    },
  }
}

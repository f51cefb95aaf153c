import type { BenchEvent, ChannelKind } from '../../src/shared/contract/frames.ts'
import { JACK } from './circuit.ts'
import type { Tuning } from './circuit.ts'
import type { Random } from './random.ts'

/** A pitch is told so long after the pluck, from a stretch that begins a little after it, ms. */
const REPORT_AFTER_MS = 200
const STRETCH_FROM_MS = 70
const STRETCH_MS = 120
/** A string stands out when its power is so much above the noise: 10 dB. */
const LEAST_RATIO = 10
/** Another string so much louder drowns it, 12 dB: then that one's pitch is heard. */
const DROWNED_RATIO = 16
/** Standard deviation of a pitch: about a cent. */
const PITCH_SPREAD = 0.0006

/** What can be heard at this moment. */
export interface Hearing {
  powerAt: (stringNo: number, point: number) => number
  noiseAt: (point: number) => number
  tuning: Tuning
}

interface Expected {
  stringNo: number
  dueFrame: number
  startTenthMs: number
}

/** Tells the pitch of each pluck as a bench would: late, a little off, and only when the string can be heard. */
export class PitchReports {
  private readonly points: readonly number[]
  private readonly reportFrames: number
  private readonly random: Random
  private waiting: Expected[] = []

  constructor(channelKind: ChannelKind, frameMs: number, random: Random) {
    this.points = channelKind === 'six' ? [0, 1, 2, 3, 4, 5] : [JACK]
    this.reportFrames = Math.ceil(REPORT_AFTER_MS / frameMs)
    this.random = random
  }

  restart(): void {
    this.waiting = []
  }

  expect(stringNo: number, frameNo: number, startTenthMs: number): void {
    this.waiting = this.waiting.filter((each) => each.stringNo !== stringNo)
    this.waiting.push({ stringNo, dueFrame: frameNo + this.reportFrames, startTenthMs })
  }

  report(frameNo: number, events: BenchEvent[], hearing: Hearing): void {
    if (this.waiting.length === 0) return
    const due = this.waiting.filter((each) => each.dueFrame <= frameNo)
    if (due.length === 0) return
    this.waiting = this.waiting.filter((each) => each.dueFrame > frameNo)
    for (const each of due) {
      const event = this.pitchOf(each, frameNo, hearing)
      if (event) events.push(event)
    }
  }

  private pitchOf(expected: Expected, frameNo: number, hearing: Hearing): BenchEvent | null {
    const loudest = (stringNo: number): { point: number; power: number } =>
      this.points
        .map((point) => ({ point, power: hearing.powerAt(stringNo, point) }))
        .reduce((best, each) => (each.power > best.power ? each : best))
    let heard = { stringNo: expected.stringNo, ...loudest(expected.stringNo) }
    const drownsFrom = heard.power * DROWNED_RATIO
    for (let stringNo = 1; stringNo <= 6; stringNo++) {
      const other = loudest(stringNo)
      if (other.power > drownsFrom && other.power > heard.power) heard = { stringNo, ...other }
    }
    const ratio = heard.power / hearing.noiseAt(heard.point)
    if (!(ratio >= LEAST_RATIO)) return null
    const offset = 1 + PITCH_SPREAD * this.random.normalWithin(3)
    return {
      kind: 'pitch',
      frame: frameNo,
      startTenthMs: expected.startTenthMs + STRETCH_FROM_MS * 10,
      durationTenthMs: STRETCH_MS * 10,
      channel: heard.point === JACK ? 0 : heard.point + 1,
      milliHz: Math.round(hearing.tuning[heard.stringNo - 1]! * 1000 * offset),
      confidencePercent: Math.min(99, Math.round(100 * (1 - 1 / Math.sqrt(ratio)))),
    }
  }
}

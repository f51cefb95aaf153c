import type { BenchEvent, Frame, RunOrder, RunPrompt } from '../../src/shared/contract/frames.ts'
import type { BenchSource, SourceStep } from '../../simulator/sources/source.ts'

/** Each frame carries its own number as its supply current, so that a test sees which one it is. */
export function numberedFrame(frameNo: number): Frame {
  return {
    levelMdb: [-90_000],
    levelAMdb: [-93_000],
    jackMdb: -90_000,
    jackAMdb: -93_000,
    clipped: 0,
    plugged: true,
    ringSleeveClosed: true,
    tipClosed: true,
    currentUa: frameNo,
    batteryMv: 9000,
  }
}

export interface CountingSource extends BenchSource {
  starts: RunOrder[]
  prompts: RunPrompt[]
  seen: boolean[]
  finished: number
}

export function makeCountingSource(
  more: Partial<BenchSource> & { lastFrame?: number; eventsOf?: (frameNo: number) => BenchEvent[] } = {},
): CountingSource {
  const { lastFrame, eventsOf, ...rest } = more
  const source: CountingSource = {
    channelKind: 'one',
    frameMs: 10,
    mainsHz: 50,
    capabilities: ['jackLevel'],
    algorithms: { source: 'counting' },
    realTime: true,
    repeatable: false,
    starts: [],
    prompts: [],
    seen: [],
    finished: 0,
    start(order) {
      source.starts.push(order)
    },
    prompt(prompt) {
      source.prompts.push(prompt)
    },
    serverSeen(seen) {
      source.seen.push(seen)
    },
    next(frameNo): SourceStep | 'ended' {
      if (lastFrame !== undefined && frameNo > lastFrame) return 'ended'
      return { frame: numberedFrame(frameNo), events: eventsOf?.(frameNo) ?? [] }
    },
    finish() {
      source.finished += 1
    },
    ...rest,
  }
  return source
}

export function buildOrder(more: Partial<RunOrder> = {}): RunOrder {
  return {
    run: 'c7c3f5de-2f0f-4d52-8a57-0a4b1c9d3e10',
    serial: 'HL2401873',
    from: 0,
    window: 200,
    noiseStretchMs: 5000,
    expectedHz: [[329.63], [246.94], [196], [146.83], [110], [82.41]],
    ...more,
  }
}

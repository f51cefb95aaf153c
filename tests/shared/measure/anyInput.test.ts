import { describe, expect, it, vi } from 'vitest'
import { NOT_MEASURED_MDB, SILENCE_MDB } from '../../../src/shared/contract/quantities.ts'
import type { BenchEvent, Frame } from '../../../src/shared/contract/frames.ts'
import { BenchEvent as BenchEventSchema, Frame as FrameSchema } from '../../../src/shared/contract/frames.ts'
import { MeasuredRun } from '../../../src/shared/contract/measured.ts'
import { RULES, type RuleId } from '../../../src/shared/contract/rules.ts'
import type { RunActionBody, RunSetup } from '../../../src/shared/contract/runs.ts'
import {
  isFinished,
  phaseOf,
  refusalOf,
  startRun,
  takeAction,
  takeFrame,
  viewRun,
} from '../../../src/shared/measure/runState.ts'
import { seededRandom } from '../../../src/shared/measure/seededRandom.ts'
import {
  buildAction,
  buildRecordingSetup,
  buildSetup,
  sheetRule,
  SIX_CHANNEL,
} from '../../helpers/runSetup.ts'

vi.setConfig({ testTimeout: 60_000 })

const everyRule = (Object.keys(RULES) as RuleId[]).map((rule) => sheetRule(rule))

/** Whatever the contract lets through, in any order: bursts, silence, gaps, events and actions at random. */
class Chaos {
  private readonly random: () => number
  private base = -80_000
  private readonly setup: RunSetup
  constructor(setup: RunSetup, seed: number) {
    this.setup = setup
    this.random = seededRandom(seed)
  }
  pick<T>(values: readonly T[]): T {
    return values[Math.floor(this.random() * values.length)]!
  }
  whole(low: number, high: number): number {
    return low + Math.floor(this.random() * (high - low + 1))
  }
  level(): number {
    const kind = this.random()
    if (kind < 0.005) return SILENCE_MDB
    if (kind < 0.01) return NOT_MEASURED_MDB
    if (kind < 0.012) return this.whole(-300_000, 100_000)
    return this.base + this.whole(-800, 800)
  }
  frame(): Frame {
    if (this.random() < 0.02) this.base = this.pick([-80_000, -80_000, -80_000, -20_000, -50_000])
    else if (this.base > -80_000) this.base = Math.max(-80_000, this.base - this.whole(0, 400))
    const levels = () => Array.from({ length: this.setup.channelKind === 'six' ? 6 : 1 }, () => this.level())
    const tri = () => (this.random() < 0.001 ? this.pick([true, false, null]) : true)
    return {
      levelMdb: levels(),
      levelAMdb: levels(),
      jackMdb: this.level(),
      jackAMdb: this.level(),
      clipped: this.random() < 0.01 ? 1 : 0,
      plugged: tri(),
      ringSleeveClosed: tri(),
      tipClosed: tri(),
      currentUa: this.pick([null, 0, 1200]),
      batteryMv: this.pick([null, 9000]),
    }
  }
  events(frame: number): BenchEvent[] {
    if (this.random() > 0.04) return []
    const place = {
      frame,
      startTenthMs: Math.max(0, frame * 100 - this.whole(0, 3000)),
      durationTenthMs: this.whole(600, 30_000),
    }
    const channel = this.whole(0, 6)
    const pole = this.pick(['tip', 'ring', 'sleeve'] as const)
    return [
      this.pick<BenchEvent>([
        {
          kind: 'pitch',
          ...place,
          channel,
          milliHz: this.pick([82_410, 110_000, 117_000, 329_630]),
          confidencePercent: this.whole(0, 100),
        },
        { kind: 'hum', ...place, durationTenthMs: 20_000, channel, mainsHz: 50, levelMdb: this.level() },
        { kind: 'disturbance', ...place, pole },
        { kind: 'contact', ...place, pole, microOhm: this.whole(0, 200_000) },
        { kind: 'insulation', ...place, testMillivolt: 5000, kiloOhm: this.whole(0, 10_000) },
        { kind: 'pedal', ...place },
        ...(this.random() < 0.05 ? [{ kind: 'discontinuity' as const, ...place }] : []),
      ]),
    ]
  }
  action(): RunActionBody {
    const stringNo = this.whole(1, 6)
    return this.pick<RunActionBody>([
      { kind: 'goOn' },
      { kind: 'noSignal', stringNo },
      { kind: 'repeatString', stringNo, reason: 'any reason' },
      {
        kind: 'enterValue',
        rule: this.pick(Object.keys(RULES) as RuleId[]),
        stringNo: null,
        value: this.whole(0, 10),
        u: 0.1,
        meter: 'a meter',
      },
      { kind: 'changePerson', person: 'Somebody' },
    ])
  }
}

describe('whatever comes', () => {
  const setups: [string, RunSetup][] = [
    [
      'a six-channel bench',
      buildSetup({ sheet: { rules: everyRule, guard: { on: true, balanceU: 0.5, levelU: 0.5 } } }),
    ],
    ['a one-channel bench', buildSetup({ channelKind: 'one', sheet: { rules: everyRule } })],
    [
      'a bench that knows no floor',
      buildSetup({ floorDb: [], calibrationDb: [], sheet: { rules: everyRule } }),
    ],
    [
      'a bench that measures little',
      buildSetup({ capabilities: ['sixLevels'], sheet: { rules: everyRule } }),
    ],
    [
      'a bench with clips',
      buildSetup({
        capabilities: [...SIX_CHANNEL, 'contactResistance', 'insulation'],
        sheet: { rules: everyRule },
      }),
    ],
    ['a recording', buildRecordingSetup()],
  ]

  it.each(setups)(
    '%s never shows a number that is none, and passes nothing that was not shown',
    (_, setup) => {
      const reached = new Set<string>()
      for (let seed = 1; seed <= 6; seed++) {
        const chaos = new Chaos(setup, seed)
        const state = startRun(setup)
        for (let frame = 0; frame < 9000 && !isFinished(state); frame++) {
          const sent = chaos.frame()
          const events = chaos.events(frame)
          if (frame % 500 === 0) {
            FrameSchema.parse(sent)
            events.forEach((event) => BenchEventSchema.parse(event))
          }
          takeFrame(state, sent, events)
          reached.add(phaseOf(state))
          const action = chaos.action()
          if (frame % 97 === 0 && refusalOf(state, action) === null)
            takeAction(state, buildAction(action, frame + 1))
          if (frame % 1500 === 0) check(state)
        }
        check(state)
      }
    },
  )

  function check(state: ReturnType<typeof startRun>) {
    const view = viewRun(state)
    expect(MeasuredRun.safeParse(view).error).toBeUndefined()
    expect(JSON.parse(JSON.stringify(view))).toEqual(view)
    for (const result of view.results) {
      if (result.result === 'within') expect(Number.isFinite(result.value)).toBe(true)
      if (result.result === 'within') expect(result.margin === null || result.margin >= 0).toBe(true)
    }
    if (view.verdict === 'pass') {
      const required = view.results.filter((result) => result.required && result.onOutside === 'reject')
      expect(required.every((result) => result.result === 'within')).toBe(true)
    }
  }
})

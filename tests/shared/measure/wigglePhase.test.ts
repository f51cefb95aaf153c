import { describe, expect, it, vi } from 'vitest'
import type { BenchEvent, Frame } from '../../../src/shared/contract/frames.ts'
import type { RunPhase } from '../../../src/shared/contract/measured.ts'
import type { RuleId } from '../../../src/shared/contract/rules.ts'
import type { RunSetup } from '../../../src/shared/contract/runs.ts'
import { WIGGLE_PLUG_OUT_MOST_MS } from '../../../src/shared/measure/constants.ts'
import { replayRun } from '../../../src/shared/measure/replayRun.ts'
import {
  changeCount,
  phaseOf,
  promptOf,
  refusalOf,
  startRun,
  takeFrame,
  viewRun,
} from '../../../src/shared/measure/runState.ts'
import { buildSetup, SIX_CHANNEL } from '../../helpers/runSetup.ts'
import { resultOf, runCheck, type Trace } from '../../helpers/runCheck.ts'
import { buildCheck, TraceBuilder } from '../../helpers/traceBuilder.ts'

// whole checks, and the machine may be busy
vi.setConfig({ testTimeout: 60_000 })

const setup = buildSetup()
const check = buildCheck({ setup })
const WIGGLE_RULES: RuleId[] = ['tipContinuity', 'disturbanceCount', 'disturbanceLongest']

/** First frame of a phase in the sound check. */
function firstFrameOf(phase: RunPhase): number {
  const state = startRun(setup)
  const at = check.frames.findIndex((frame, i) => {
    if (phaseOf(state) === phase) return true
    takeFrame(
      state,
      frame,
      check.events.filter((event) => event.frame === i),
    )
    return false
  })
  if (at < 0) throw new Error(`the check has no ${phase}`)
  return at
}

const readyFrom = firstFrameOf('wiggleReady')
const wiggleFrom = firstFrameOf('wiggle')
const plugOut: Partial<Frame> = { plugged: false, tipClosed: null }

/** The sound check, `moreMs` longer, with frames changed from `fromMs` to `toMs` after `start`. */
function changed(
  start: number,
  [fromMs, toMs]: [number, number],
  change: Partial<Frame>,
  { moreMs = 0, events = [] }: { moreMs?: number; events?: BenchEvent[] } = {},
): Trace {
  const frames = [...check.frames, ...new TraceBuilder(setup).run(moreMs).frames]
  return {
    frames: frames.map((frame, i) =>
      i >= start + fromMs / 10 && i < start + toMs / 10 ? { ...frame, ...change } : frame,
    ),
    events: [...check.events, ...events],
  }
}

/** A disturbance that starts `ms` after the wiggle began, told with the frame it starts in or `lateMs` later. */
function disturbance(ms: number, lateMs = 0): BenchEvent {
  return {
    kind: 'disturbance',
    pole: 'tip',
    frame: wiggleFrom + Math.floor((ms + lateMs) / 10),
    startTenthMs: wiggleFrom * 100 + ms * 10,
    durationTenthMs: 20,
  }
}

const discontinuity = (ms: number): BenchEvent => ({
  kind: 'discontinuity',
  frame: wiggleFrom + ms / 10,
  startTenthMs: 0,
  durationTenthMs: 0,
})

/** State after the frames up to `ms` after the wiggle began, or would have. */
function stateAt({ frames, events }: Trace, ms: number) {
  const count = wiggleFrom + ms / 10
  return replayRun(
    setup,
    frames.slice(0, count),
    events.filter((event) => event.frame < count),
    [],
  )
}

describe('getting ready to wiggle', () => {
  it('waits with the plug out, asks for it, and takes its time again when it is in', () => {
    const trace = changed(readyFrom, [1000, 9000], plugOut, { moreMs: 20_000 })
    const at = (ms: number) => replayRun(setup, trace.frames.slice(0, readyFrom + ms / 10), check.events, [])
    expect(promptOf(at(1000)).prompt).toBe('getReadyToWiggle')
    expect(promptOf(at(1010)).prompt).toBe('plugIn')
    expect(changeCount(at(1010))).toBeGreaterThan(changeCount(at(1000)))
    expect(phaseOf(at(9000))).toBe('wiggleReady')
    expect(refusalOf(at(9000), { kind: 'goOn' })).toMatch(/Plug in/)
    expect(promptOf(at(9010)).prompt).toBe('getReadyToWiggle')
    expect(refusalOf(at(9010), { kind: 'goOn' })).toBeNull()
    expect([phaseOf(at(12_990)), phaseOf(at(13_000))]).toEqual(['wiggleReady', 'wiggle'])
    expect(runCheck(setup, trace).verdict).toBe('pass')
  })

  it('does not begin by the foot switch with the plug out', () => {
    const pedal: BenchEvent = { kind: 'pedal', frame: readyFrom + 50, startTenthMs: 0, durationTenthMs: 0 }
    const trace = changed(readyFrom, [100, 60_000], plugOut, { events: [pedal] })
    expect(runCheck(setup, trace)).toMatchObject({ phase: 'wiggleReady', verdict: null })
  })
})

describe('a plug that comes out in the wiggle', () => {
  it('starts the wiggle again when it is back, in full', () => {
    const trace = changed(wiggleFrom, [2000, 4000], plugOut, { moreMs: 10_000 })
    expect(promptOf(stateAt(trace, 2000)).prompt).toBe('wiggleNow')
    expect(promptOf(stateAt(trace, 2010)).prompt).toBe('plugIn')
    expect(viewRun(stateAt(trace, 3000))).toMatchObject({ progress: 0, jack: { wiggleProgress: 0 } })
    expect(promptOf(stateAt(trace, 4010)).prompt).toBe('wiggleNow')
    // the frame that shows the plug back, 5 s, and 300 ms for late reports
    expect(phaseOf(stateAt(trace, 9300))).toBe('wiggle')
    expect(phaseOf(stateAt(trace, 9310))).toBe('done')
    expect(runCheck(setup, trace).verdict).toBe('pass')
  })

  it('is not passed over when it stays out to the end of the trace', () => {
    const view = runCheck(setup, changed(wiggleFrom, [0, 60_000], plugOut, { moreMs: 10_000 }))
    expect(view).toMatchObject({ phase: 'wiggle', verdict: null })
    for (const rule of WIGGLE_RULES) expect(resultOf(view, rule).result).toBe('notTested')
  })

  it('keeps disturbances seen before, also those told late, and counts none while it is out', () => {
    const trace = changed(wiggleFrom, [2000, 2100], plugOut, {
      moreMs: 10_000,
      events: [
        disturbance(500),
        disturbance(1990, 200),
        disturbance(2005),
        disturbance(2050),
        disturbance(2105),
        disturbance(3000),
      ],
    })
    const view = runCheck(setup, trace)
    expect(view.jack.disturbanceCount).toBe(4)
    expect(view.verdict).toBe('fail')
  })

  it('keeps a tip that was seen open before', () => {
    const trace = changed(wiggleFrom, [2000, 3000], plugOut, { moreMs: 10_000 })
    const frames = trace.frames.map((frame, i) =>
      i === wiggleFrom + 100 ? { ...frame, tipClosed: false } : frame,
    )
    expect(resultOf(runCheck(setup, { ...trace, frames }), 'tipContinuity').result).toBe('outside')
  })

  it('ends the wiggle without a reading when it stays out for half a minute', () => {
    const trace = changed(wiggleFrom, [2000, 60_000], plugOut, { moreMs: 60_000, events: [disturbance(500)] })
    expect(phaseOf(stateAt(trace, 2000 + WIGGLE_PLUG_OUT_MOST_MS))).toBe('wiggle')
    expect(phaseOf(stateAt(trace, 2010 + WIGGLE_PLUG_OUT_MOST_MS))).toBe('done')
    const view = runCheck(setup, trace)
    for (const rule of WIGGLE_RULES)
      expect(resultOf(view, rule)).toMatchObject({ result: 'invalid', why: 'disagreesWithState' })
    expect(view.jack).toMatchObject({ tipSteady: null, disturbanceCount: null, disturbanceLongestMs: null })
    expect(view.verdict).toBe('none')
  })

  it('ends it too when it comes out again and again', () => {
    const trace = changed(wiggleFrom, [0, 0], {}, { moreMs: 60_000 })
    const frames = trace.frames.map((frame, i) =>
      i >= wiggleFrom && i % 300 === 0 ? { ...frame, ...plugOut } : frame,
    )
    const view = runCheck(setup, { ...trace, frames })
    expect(view).toMatchObject({ phase: 'done', verdict: 'none' })
    expect(resultOf(view, 'disturbanceCount').why).toBe('disagreesWithState')
  })

  it('does not matter once the wiggle is over', () => {
    const view = runCheck(setup, changed(wiggleFrom, [5000, 60_000], plugOut))
    expect(view).toMatchObject({ phase: 'done', verdict: 'pass' })
  })
})

describe('a discontinuity in the wiggle', () => {
  it('keeps disturbances already counted, and the watching starts again', () => {
    const trace = changed(
      wiggleFrom,
      [0, 0],
      {},
      {
        moreMs: 10_000,
        events: [disturbance(500), discontinuity(2000), disturbance(6900), disturbance(7000)],
      },
    )
    expect(phaseOf(stateAt(trace, 7290))).toBe('wiggle')
    expect(phaseOf(stateAt(trace, 7300))).toBe('done')
    expect(runCheck(setup, trace).jack.disturbanceCount).toBe(2)
  })

  it('while the plug is out leaves it waited for', () => {
    const trace = changed(wiggleFrom, [1000, 3000], plugOut, {
      moreMs: 10_000,
      events: [discontinuity(2000), disturbance(2005)],
    })
    expect(promptOf(stateAt(trace, 2500)).prompt).toBe('plugIn')
    expect(runCheck(setup, trace)).toMatchObject({ verdict: 'pass', jack: { disturbanceCount: 0 } })
  })
})

describe('a wiggle in which the tip is not measured', () => {
  const unmeasured = (toMs: number, events: BenchEvent[] = []) =>
    changed(wiggleFrom, [0, toMs], { tipClosed: null }, { events })

  it('is within of nothing on a bench that says it measures the tip', () => {
    const view = runCheck(setup, unmeasured(60_000))
    for (const rule of WIGGLE_RULES)
      expect(resultOf(view, rule)).toMatchObject({ result: 'invalid', why: 'disagreesWithState' })
    expect(view.verdict).toBe('none')
  })

  it('may miss a tenth of its frames, and not one more', () => {
    expect(resultOf(runCheck(setup, unmeasured(500)), 'tipContinuity').result).toBe('within')
    expect(resultOf(runCheck(setup, unmeasured(510)), 'tipContinuity').result).toBe('invalid')
  })

  it('still fails for disturbances that were seen', () => {
    const view = runCheck(setup, unmeasured(60_000, [disturbance(500)]))
    expect(resultOf(view, 'disturbanceCount')).toMatchObject({ result: 'outside', value: 1 })
    expect(view.verdict).toBe('fail')
  })

  it('is judged by its disturbances alone on a bench that does not say so', () => {
    const without: RunSetup = buildSetup({
      capabilities: SIX_CHANNEL.filter((capability) => capability !== 'tipContinuity'),
    })
    const view = runCheck(without, unmeasured(60_000))
    expect(resultOf(view, 'disturbanceCount')).toMatchObject({ result: 'within', value: 0 })
    expect(resultOf(view, 'tipContinuity').result).toBe('notTested')
  })
})

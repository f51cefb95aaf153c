import { describe, expect, it } from 'vitest'
import type { BenchEvent } from '../../../src/shared/contract/frames.ts'
import type { RunAction, RunActionBody, RunSetup } from '../../../src/shared/contract/runs.ts'
import { replayRun } from '../../../src/shared/measure/replayRun.ts'
import {
  MeasureRefusal,
  phaseOf,
  promptOf,
  refusalOf,
  startRun,
  takeAction,
  viewRun,
} from '../../../src/shared/measure/runState.ts'
import {
  buildAction,
  buildRecordingSetup,
  buildSetup,
  ONE_CHANNEL,
  sheetRule,
  SIX_CHANNEL,
} from '../../helpers/runSetup.ts'
import { resultOf, runCheck } from '../../helpers/runCheck.ts'
import { buildCheck, soundStrings, TraceBuilder } from '../../helpers/traceBuilder.ts'

const recording = buildRecordingSetup()
const goOn: RunActionBody = { kind: 'goOn' }

/** A recording set-up in its strings phase, and actions laid along its trace. */
function script(setup: RunSetup = recording) {
  const trace = new TraceBuilder(setup).run(2600)
  const actions: RunAction[] = []
  const act = (action: RunActionBody) => void actions.push(buildAction(action, trace.at, actions.length + 1))
  return {
    trace,
    act,
    view: () => runCheck(setup, trace, actions),
    state: () => replayRun(setup, trace.frames, trace.events, actions),
  }
}

describe('a string that was plucked and gave nothing', () => {
  it('is silent after three, at most floor + 6 dB, and fails', () => {
    const { trace, act, view } = script()
    for (let i = 0; i < 3; i++) {
      trace.run(1000)
      act(goOn)
    }
    trace.run(100)
    const { strings, plucks, promptStringNo } = view()
    expect(strings[5]).toMatchObject({ state: 'silent', noSignalCount: 3, tries: 3, accepted: 0 })
    expect(strings[5]!.level).toMatchObject({ atMost: true, n: 0, u: null })
    expect(strings[5]!.level.value).toBeCloseTo(-74, 1)
    expect(plucks.map((pluck) => [pluck.toldBy, pluck.dropped, pluck.stringNo])).toEqual([
      ['person', 'belowFloor', 6],
      ['person', 'belowFloor', 6],
      ['person', 'belowFloor', 6],
    ])
    expect(promptStringNo).toBe(5)
    expect(resultOf(view(), 'speaks', 6)).toMatchObject({ result: 'outside', why: 'noSignal', value: 0 })
  })

  it('fails the run in spite of five good ones, which do not look loud', () => {
    const { trace, act, view } = script()
    for (let i = 0; i < 3; i++) {
      trace.run(1000)
      act({ kind: 'noSignal', stringNo: 3 })
    }
    for (const { stringNo, levelDb } of soundStrings()) {
      if (stringNo !== 3) for (let i = -1; i <= 1; i++) trace.pluck(stringNo, { levelDb: levelDb + i / 2 })
    }
    const done = view()
    expect(done).toMatchObject({ phase: 'done', verdict: 'fail' })
    expect(done.strings.map((string) => string.inReference)).toEqual([true, true, false, true, true, true])
    expect(done.strings[0]!.balance.value).toBeCloseTo(0, 2)
    expect(done.strings[2]!.balance).toMatchObject({ atMost: true })
    expect(resultOf(done, 'balance', 3)).toMatchObject({ result: 'outside', atMost: true })
    expect(resultOf(done, 'range')).toMatchObject({ result: 'outside', why: 'noSignal', value: null })
    expect(resultOf(done, 'snFlat')).toMatchObject({ result: 'outside', atMost: true })
    expect(done.snFlat.value).toBeCloseTo(6, 6)
  })

  it('counts what the bench heard on other elements as well', () => {
    const { trace, view } = script()
    for (let i = 0; i < 3; i++) trace.pluck(6, { levelDb: -20, ownSilent: true })
    expect(view().strings[5]).toMatchObject({ state: 'silent', noSignalCount: 3 })
  })

  it('is not counted twice when the foot switch follows what the bench heard', () => {
    const { trace, act, view } = script()
    for (let i = 0; i < 2; i++) {
      trace.pluck(6, { levelDb: -20, ownSilent: true })
      act(goOn)
      trace.run(1500)
    }
    expect(view().strings[5]).toMatchObject({ state: 'todo', noSignalCount: 2 })
  })

  it('is told by the foot switch too', () => {
    const { trace, view } = script()
    for (let i = 0; i < 3; i++) trace.run(800).happen('pedal').run(10)
    expect(view().strings[5]).toMatchObject({ state: 'silent' })
  })

  it('is not believed while a pluck is analysed or its channel sounds', () => {
    const { trace, act, view } = script()
    trace.pluck(6, { levelDb: -20, ringMs: 150, restMs: 0, undamped: true })
    act(goOn)
    trace.run(900)
    act({ kind: 'noSignal', stringNo: 6 })
    trace.damp(200)
    const { strings, plucks } = view()
    expect(strings[5]).toMatchObject({ noSignalCount: 0, accepted: 1 })
    expect(plucks).toHaveLength(1)
  })

  it('does not make a string silent that was heard once', () => {
    const { trace, act, view } = script()
    trace.pluck(6, { levelDb: -20 })
    for (let i = 0; i < 7; i++) {
      trace.run(600)
      act(goOn)
    }
    expect(view().strings[5]).toMatchObject({ state: 'triesUsed', accepted: 1, tries: 8 })
  })
})

describe('repeating a string', () => {
  it('is allowed once, with its reason, and starts its tries again', () => {
    const { trace, act, state } = script()
    for (let i = 0; i < 3; i++) trace.pluck(6, { levelDb: -20 })
    act({ kind: 'repeatString', stringNo: 6, reason: 'slipped' })
    for (let i = 0; i < 3; i++) trace.pluck(6, { levelDb: -22 })
    const after = state()
    expect(viewRun(after).strings[5]).toMatchObject({ accepted: 3, tries: 3, repeated: true })
    expect(viewRun(after).strings[5]!.level.value).toBeCloseTo(-22, 2)
    expect(refusalOf(after, { kind: 'repeatString', stringNo: 6, reason: 'again' })).toMatch(/once/)
    expect(refusalOf(after, { kind: 'repeatString', stringNo: 5, reason: 'again' })).toMatch(/no plucks/)
  })

  it('takes a run that waits for the wiggle back to its strings', () => {
    const setup = buildSetup()
    const { frames, events } = buildCheck({ setup })
    const upTo =
      frames.findIndex(
        (_, i) => phaseOf(replayRun(setup, frames.slice(0, i * 50), events, [])) === 'wiggleReady',
      ) * 50
    const state = replayRun(setup, frames.slice(0, upTo), events, [])
    takeAction(state, buildAction({ kind: 'repeatString', stringNo: 2, reason: 'slipped' }, upTo))
    expect(phaseOf(state)).toBe('strings')
    expect(promptOf(state)).toEqual({ prompt: 'dampThenPluck', stringNo: 2 })
  }, 60_000)
})

describe('entering a value', () => {
  const capabilities = SIX_CHANNEL.filter(
    (capability) => capability !== 'battery' && capability !== 'current',
  )
  const rules = [sheetRule('speaks'), sheetRule('battery'), sheetRule('currentPlugged')]
  const setup = buildSetup({ capabilities, sheet: { rules } })
  const battery: RunActionBody = {
    kind: 'enterValue',
    rule: 'battery',
    stringNo: null,
    value: 9.1,
    u: 0.05,
    meter: 'bench multimeter',
  }
  const current: RunActionBody = { ...battery, rule: 'currentPlugged', value: 1.3, u: 0.02 }

  it('is waited for when a required rule needs it, then the run is judged', () => {
    const trace = buildCheck({ setup })
    const waiting = replayRun(setup, trace.frames, trace.events, [])
    expect(phaseOf(waiting)).toBe('entry')
    expect(viewRun(waiting)).toMatchObject({ prompt: 'enterValues', verdict: null })
    const end = trace.frames.length
    const view = runCheck(setup, trace, [buildAction(battery, end, 1), buildAction(current, end, 2)])
    expect(view).toMatchObject({ phase: 'done', verdict: 'pass' })
    expect(resultOf(view, 'battery')).toMatchObject({ byHand: true, value: 9.1, result: 'within' })
    expect(resultOf(view, 'battery').expandedU).toBeCloseTo(0.05 * 1.6448536269514722, 9)
    expect(view.entered).toHaveLength(2)
    expect(view.warnings).not.toContain('ruleNotMeasurable')
  })

  it('fails when it lies outside, and leaves no verdict when it is skipped', () => {
    const trace = buildCheck({ setup })
    const end = trace.frames.length
    const low = runCheck(setup, trace, [
      buildAction({ ...battery, value: 7 }, end, 1),
      buildAction(current, end, 2),
    ])
    expect(low.verdict).toBe('fail')
    const skipped = runCheck(setup, trace, [buildAction(battery, end, 1), buildAction(goOn, end, 2)])
    expect(skipped.verdict).toBe('none')
    expect(resultOf(skipped, 'currentPlugged')).toMatchObject({ result: 'notTested', why: 'notMeasurable' })
  })

  it('again replaces the earlier one', () => {
    const state = startRun(setup)
    takeAction(state, buildAction(battery, 0, 1))
    takeAction(state, buildAction({ ...battery, value: 9.3 }, 0, 2))
    expect(viewRun(state).entered.map((entry) => entry.value)).toEqual([9.3])
  })

  it.each([
    ['what the sheet does not ask for', { rule: 'insulation' }],
    ['what the bench measures itself', { rule: 'speaks' }],
    ['a value that is not finite', { value: NaN }],
    ['an uncertainty that is not finite', { u: Infinity }],
    ['a value for one string', { stringNo: 3 }],
  ] as const)('refuses %s', (_, change) => {
    expect(refusalOf(startRun(setup), { ...battery, ...change })).not.toBeNull()
  })

  it('refuses what no meter can read, and yes/no that is neither', () => {
    const blind = buildSetup({
      capabilities: ONE_CHANNEL.filter((capability) => capability !== 'plugState'),
      sheet: { rules: [sheetRule('channelSeparation'), sheetRule('switchOpen')] },
    })
    expect(refusalOf(startRun(blind), { ...battery, rule: 'channelSeparation' })).toMatch(/meter/)
    expect(refusalOf(startRun(blind), { ...battery, rule: 'switchOpen', value: 0.5 })).toMatch(/1 for yes/)
    expect(refusalOf(startRun(blind), { ...battery, rule: 'switchOpen', value: 1 })).toBeNull()
  })
})

describe('stopping', () => {
  it('ends the run at any step without a verdict', () => {
    const { trace, act, view, state } = script()
    for (let i = 0; i < 3; i++) trace.pluck(6, { levelDb: -60 })
    act({ kind: 'stop', reason: 'string broke' })
    trace.run(500)
    expect(view()).toMatchObject({ phase: 'stopped', prompt: 'stopped', verdict: 'none', provisional: false })
    expect(view().plucks).toHaveLength(3)
    for (const action of [
      goOn,
      { kind: 'stop', reason: 'again' },
      { kind: 'changePerson', person: 'A' },
    ] as const) {
      expect(refusalOf(state(), action)).toBe('The run has ended.')
    }
  })
})

describe('going on', () => {
  const setup = buildSetup()
  const stateAt = (build: (trace: TraceBuilder) => unknown) => {
    const trace = new TraceBuilder(setup).setPlug(false)
    build(trace)
    return replayRun(setup, trace.frames, trace.events, [])
  }

  it('is refused where the bench sees for itself, without changing anything', () => {
    const state = stateAt((trace) => trace.run(300))
    const before = JSON.stringify(viewRun(state))
    expect(() => takeAction(state, buildAction(goOn, 30))).toThrow(MeasureRefusal)
    try {
      takeAction(state, buildAction(goOn, 30))
      expect.unreachable()
    } catch (error) {
      expect(error).toMatchObject({
        code: 'run.action-not-now',
        detail: 'The bench sees the plug and goes on by itself.',
      })
    }
    expect(JSON.stringify(viewRun(state))).toBe(before)
  })

  it('ends settling after 3 s but not before', () => {
    const settling = (ms: number) =>
      stateAt((trace) => {
        trace.run(600).setPlug(true).run(ms)
        // a floor that keeps falling
        trace.frames
          .slice(60)
          .forEach((frame, i) => (frame.levelMdb = frame.levelMdb.map(() => -60_000 - 50 * i)))
      })
    expect(refusalOf(settling(2900), goOn)).toMatch(/settled/)
    const state = settling(3200)
    expect(phaseOf(state)).toBe('settle')
    takeAction(state, buildAction(goOn, state.frames))
    expect(phaseOf(state)).toBe('jackRest')
  })

  it('takes the noise as it is only after the screen has said that it is not quiet', () => {
    const noisy = (ms: number) => {
      const trace = new TraceBuilder(recording).run(ms)
      for (let i = 50; i < trace.frames.length; i += 60) trace.frames[i]!.levelMdb[0] = -50_000
      return replayRun(recording, trace.frames, [], [])
    }
    expect(refusalOf(noisy(5000), goOn)).toMatch(/muted/)
    const state = noisy(8500)
    expect(phaseOf(state)).toBe('noise')
    takeAction(state, buildAction(goOn, 850))
    expect(phaseOf(state)).toBe('strings')
    expect(viewRun(state).noise.at).toBe(1)
  })

  it('by a foot switch at the wrong moment does nothing', () => {
    const pedal: BenchEvent = { kind: 'pedal', frame: 5, startTenthMs: 500, durationTenthMs: 0 }
    const trace = new TraceBuilder(setup).setPlug(false).run(300)
    expect(phaseOf(replayRun(setup, trace.frames, [pedal], []))).toBe('unplugged')
  })

  it('names no string that is finished', () => {
    const { trace, state } = script()
    for (let i = 0; i < 3; i++) trace.pluck(6, { levelDb: -20 })
    expect(refusalOf(state(), { kind: 'noSignal', stringNo: 6 })).toMatch(/finished/)
    expect(refusalOf(state(), { kind: 'noSignal', stringNo: 5 })).toBeNull()
    expect(refusalOf(startRun(setup), { kind: 'noSignal', stringNo: 5 })).toMatch(/No string/)
  })
})

import { describe, expect, it } from 'vitest'
import { promptOf } from '../../../src/shared/measure/runState.ts'
import { replayRun } from '../../../src/shared/measure/replayRun.ts'
import type { RunSetup } from '../../../src/shared/contract/runs.ts'
import { buildRecordingSetup, sheetRule } from '../../helpers/runSetup.ts'
import { resultOf, runCheck } from '../../helpers/runCheck.ts'
import { TraceBuilder } from '../../helpers/traceBuilder.ts'

/** Plucks of given levels, string by string, after the muted stretch. */
function plucked(setup: RunSetup, levels: Partial<Record<number, number[]>>) {
  const trace = new TraceBuilder(setup, { jitterDb: 0 }).run(2600)
  for (const stringNo of [6, 5, 4, 3, 2, 1]) {
    for (const levelDb of levels[stringNo] ?? []) trace.pluck(stringNo, { levelDb })
  }
  return {
    trace,
    view: () => runCheck(setup, trace),
    state: () => replayRun(setup, trace.frames, trace.events, []),
  }
}
const even = [-20.5, -20, -19.5]
const others = { 5: even, 4: even, 3: even, 2: even, 1: even }

describe('what a string still needs', () => {
  it('is asked for from bass to treble, whatever order it is plucked in', () => {
    const setup = buildRecordingSetup()
    expect(promptOf(plucked(setup, {}).state())).toEqual({ prompt: 'dampThenPluck', stringNo: 6 })
    expect(promptOf(plucked(setup, { 3: even, 1: even }).state())).toEqual({
      prompt: 'dampThenPluck',
      stringNo: 6,
    })
    expect(promptOf(plucked(setup, { 6: even, 5: even }).state())).toEqual({
      prompt: 'dampThenPluck',
      stringNo: 4,
    })
  })

  it('is asked for again after a drop', () => {
    const { trace, state } = plucked(buildRecordingSetup(), {})
    trace.pluck(6, { levelDb: -20, clipped: 3 })
    expect(promptOf(state())).toEqual({ prompt: 'pluckAgain', stringNo: 6 })
    trace.pluck(6, { levelDb: -20 })
    expect(promptOf(state())).toEqual({ prompt: 'dampThenPluck', stringNo: 6 })
  })

  it('grows by one while the scatter is too large, up to the maximum, then its rules are invalid', () => {
    const setup = buildRecordingSetup('six', { plucks: { n: 3, nMax: 5, largestSDb: 1 } })
    const three = plucked(setup, { 6: [-22, -20, -18] })
    expect(promptOf(three.state())).toEqual({ prompt: 'pluckMore', stringNo: 6 })
    expect(three.view().strings[5]).toMatchObject({ state: 'todo', wanted: 4 })
    // 2 dB apart at first, then settling: s falls to 1 with the fifth
    expect(plucked(setup, { 6: [-21.2, -20, -18.8, -20] }).view().strings[5]).toMatchObject({
      state: 'done',
      accepted: 4,
    })
    const wide = plucked(setup, { ...others, 6: [-23, -20, -17, -23, -17] }).view()
    expect(wide.strings[5]).toMatchObject({ state: 'done', accepted: 5 })
    expect(resultOf(wide, 'balance', 6)).toMatchObject({ result: 'invalid', why: 'scatterTooLarge' })
    expect(resultOf(wide, 'range')).toMatchObject({ result: 'invalid', why: 'scatterTooLarge' })
    expect(resultOf(wide, 'speaks', 6).result).toBe('within')
    expect(wide.verdict).toBe('none')
  })

  it('ends after 2n + 2 tries: judged on three, invalid on fewer', () => {
    const setup = buildRecordingSetup('six', { plucks: { n: 4, nMax: 6, largestSDb: 2 } })
    const tried = (kept: number) => {
      const trace = new TraceBuilder(setup, { jitterDb: 0 }).run(2600)
      for (let i = 0; i < 10; i++) trace.pluck(6, { levelDb: -20, clipped: i < kept ? 0 : 1 })
      for (const stringNo of [5, 4, 3, 2, 1])
        for (let i = 0; i < 4; i++) trace.pluck(stringNo, { levelDb: -20 })
      return runCheck(setup, trace)
    }
    const three = tried(3)
    expect(three.strings[5]).toMatchObject({ state: 'triesUsed', accepted: 3, tries: 10, triesMax: 10 })
    expect(resultOf(three, 'balance', 6)).toMatchObject({ result: 'within', n: 3 })
    expect(three.verdict).toBe('pass')
    expect(resultOf(tried(2), 'balance', 6)).toMatchObject({ result: 'invalid', why: 'tooFewPlucks' })
    expect(resultOf(tried(0), 'speaks', 6)).toMatchObject({ result: 'invalid', why: 'tooFewPlucks' })
    expect(tried(0).verdict).toBe('none')
  })
})

describe('the guard band', () => {
  const guarded = (change = {}) =>
    buildRecordingSetup('six', {
      guard: { on: true, balanceU: 0.8, levelU: 1 },
      plucks: { n: 3, nMax: 5, largestSDb: 2 },
      rules: [sheetRule('speaks'), sheetRule('balance', { low: -2.5, high: 2.5 })],
      ...change,
    })
  // -2.4 dB against the other five is -2 against all six: between -1.7 and -2.5
  const low = (levels: number[]) => ({ ...others, 6: levels })

  it('asks for more plucks of a string in it, and takes it when they bring it out', () => {
    const waiting = plucked(guarded(), low([-22.4, -22.4, -22.4]))
    expect(waiting.view().phase).toBe('strings')
    expect(promptOf(waiting.state())).toEqual({ prompt: 'pluckMore', stringNo: 6 })
    expect(waiting.view().strings[5]).toMatchObject({ state: 'todo', wanted: 4 })
    waiting.trace.pluck(6, { levelDb: -20 })
    const done = waiting.view()
    expect(done.strings[5]).toMatchObject({ accepted: 4 })
    expect(resultOf(done, 'balance', 6).value).toBeCloseTo((-1.8 * 5) / 6, 2)
    expect(done).toMatchObject({ phase: 'done', verdict: 'pass' })
  })

  it('fails a string that is still in it with the most plucks: not shown to conform', () => {
    const { trace, view } = plucked(guarded(), low([-22.4, -22.4, -22.4]))
    trace.pluck(6, { levelDb: -22.4 })
    expect(view().strings[5]).toMatchObject({ wanted: 5, state: 'todo' })
    trace.pluck(6, { levelDb: -22.4 })
    expect(view()).toMatchObject({ phase: 'done', verdict: 'fail' })
    expect(resultOf(view(), 'balance', 6)).toMatchObject({ result: 'outside', why: 'inGuardBand', n: 5 })
    expect(resultOf(view(), 'balance', 6).margin).toBeCloseTo(0.5, 2)
  })

  it('off is simple acceptance', () => {
    const off = guarded({ guard: { on: false, balanceU: 0.8, levelU: 1 } })
    expect(plucked(off, low([-22.4, -22.4, -22.4])).view()).toMatchObject({ phase: 'done', verdict: 'pass' })
  })

  it('asks for nothing where a rule only advises', () => {
    const advice = guarded({ patternDb: null })
    const view = plucked(advice, low([-22.4, -22.4, -22.4])).view()
    expect(view.phase).toBe('done')
    expect(resultOf(view, 'balance', 6)).toMatchObject({
      onOutside: 'advise',
      required: false,
      why: 'patternNotSet',
    })
    expect(view.verdict).toBe('pass')
  })
})

describe('uncertainty of a run', () => {
  it('pools the scatter of its strings, or takes the bench study', () => {
    const setup = buildRecordingSetup()
    const own = { uCalOwnDb: 0, uCalSharedDb: 0 }
    const pooled = plucked({ ...setup, ...own }, { 6: [-21, -20, -19], ...others }).view()
    // s_p^2 = (2 * 1 + 5 * 2 * 0.25) / 12
    const sP = Math.sqrt((2 + 2.5) / 12)
    const uStart = ((0.01 / Math.sqrt(12)) * 8) ** 2
    expect(pooled.strings[5]!.level.u).toBeCloseTo(Math.sqrt(sP ** 2 / 3 + uStart), 4)
    expect(pooled.strings[5]!.level.dof).toBeGreaterThan(12)
    expect(pooled.strings[5]!.level.dof).toBeLessThan(13)
    const studied = plucked({ ...setup, ...own, studySDb: 1.2 }, { 6: even, ...others }).view()
    expect(studied.strings[5]!.level.u).toBeCloseTo(Math.sqrt(1.44 / 3 + uStart), 4)
    expect(studied.strings[5]!.level.dof).toBeNull()
  })

  it('keeps what is shared in a level and drops it from a balance', () => {
    const uOf = (change: Partial<RunSetup>, kind: 'six' | 'one' = 'six') => {
      const { strings } = plucked({ ...buildRecordingSetup(kind), ...change }, { 6: even, ...others }).view()
      return { level: strings[0]!.level.u!, balance: strings[0]!.balance.u! }
    }
    const none = uOf({ uCalOwnDb: 0, uCalSharedDb: 0 })
    const shared = uOf({ uCalOwnDb: 0, uCalSharedDb: 0.5 })
    const own = uOf({ uCalOwnDb: 0.5, uCalSharedDb: 0 })
    const oneChannel = uOf({ uCalOwnDb: 0.5, uCalSharedDb: 0 }, 'one')
    expect(shared.balance).toBeCloseTo(none.balance, 12)
    expect(shared.level).toBeCloseTo(Math.hypot(none.level, 0.5), 9)
    expect(own.balance).toBeCloseTo(Math.sqrt(none.balance ** 2 + 0.25 * (30 / 36)), 9)
    expect(oneChannel.balance).toBeCloseTo(none.balance, 3)
    expect(oneChannel.level).toBeCloseTo(Math.hypot(none.level, 0.5), 3)
  })

  it('is shown with every balance of a finished run', () => {
    const { view } = plucked(buildRecordingSetup(), { 6: even, ...others })
    for (const string of view().strings) {
      expect(string.balance.n).toBe(3)
      expect(string.balance.expandedU).toBeGreaterThan(0)
    }
    expect(view().range.expandedU).toBeGreaterThan(0)
  })
})

describe('a reference that is not there', () => {
  it('makes balances invalid, while the range still fails', () => {
    const far = [-60.5, -60, -59.5]
    const view = plucked(buildRecordingSetup(), { 6: even, 5: even, 4: even, 3: far, 2: far, 1: far }).view()
    expect(view.referenceDb).toBeNull()
    expect(resultOf(view, 'balance', 1)).toMatchObject({ result: 'invalid', why: 'noReference' })
    expect(resultOf(view, 'range')).toMatchObject({ result: 'outside' })
    expect(view.range.value).toBeCloseTo(40, 1)
    expect(view.verdict).toBe('fail')
  })
})

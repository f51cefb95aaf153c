import { describe, expect, it, vi } from 'vitest'
import { SILENCE_MDB } from '../../../src/shared/contract/quantities.ts'
import type { BenchEvent } from '../../../src/shared/contract/frames.ts'
import { MeasuredRun, type RunPhase } from '../../../src/shared/contract/measured.ts'
import type { RunSetup } from '../../../src/shared/contract/runs.ts'
import { replayRun } from '../../../src/shared/measure/replayRun.ts'
import {
  changeCount,
  isFinished,
  noiseStretchMsOf,
  phaseOf,
  promptOf,
  startRun,
  takeFrame,
  viewRun,
} from '../../../src/shared/measure/runState.ts'
import {
  buildRecordingSetup,
  buildSetup,
  ONE_CHANNEL,
  sheetRule,
  SIX_CHANNEL,
} from '../../helpers/runSetup.ts'
import { resultOf, runCheck, type Trace } from '../../helpers/runCheck.ts'
import { buildCheck, soundStrings, TraceBuilder } from '../../helpers/traceBuilder.ts'

const byFrame = ({ frames, events }: Trace): BenchEvent[][] => {
  const sent: BenchEvent[][] = frames.map(() => [])
  for (const event of events) sent[event.frame]!.push(event)
  return sent
}

// whole checks, and the machine may be busy
vi.setConfig({ testTimeout: 60_000 })

/** Phases in the order that a trace goes through them, with the frame that each began at. */
function phasesThrough(setup: RunSetup, trace: Trace): [RunPhase, number][] {
  const state = startRun(setup)
  const sent = byFrame(trace)
  const seen: [RunPhase, number][] = [[phaseOf(state), 0]]
  trace.frames.forEach((frame, i) => {
    takeFrame(state, frame, sent[i]!)
    if (phaseOf(state) !== seen.at(-1)![0]) seen.push([phaseOf(state), i + 1])
  })
  return seen
}

describe('a whole check', () => {
  it.each([
    ['six-channel, 10 ms', buildSetup()],
    ['six-channel, 5 ms', buildSetup({ frameMs: 5 })],
    ['one-channel', buildSetup({ channelKind: 'one' })],
  ])('of a sound instrument on a %s bench goes through every phase and passes', (_, setup) => {
    const trace = buildCheck({ setup })
    const phases = phasesThrough(setup, trace).map(([phase]) => phase)
    expect(phases).toEqual([
      'unplugged',
      'settle',
      'jackRest',
      'noise',
      'strings',
      'wiggleReady',
      'wiggle',
      'done',
    ])
    const view = runCheck(setup, trace)
    expect(view.verdict).toBe('pass')
    expect(view.phases).toEqual(phases)
    expect(view.plucks).toHaveLength(18)
    expect(view.plucks.every((pluck) => pluck.dropped === null && pluck.toldBy === 'pitch')).toBe(true)
  })

  it('of a recording has noise and strings only', () => {
    const setup = buildRecordingSetup()
    const trace = buildCheck({ setup })
    expect(phasesThrough(setup, trace).map(([phase]) => phase)).toEqual(['noise', 'strings', 'done'])
    expect(runCheck(setup, trace).verdict).toBe('pass')
  })

  it('reads levels, balances, range, step and mean level as they were laid', () => {
    const setup = buildSetup({ sheet: { patternDb: [0.5, 0.5, 0, 0, -0.5, -0.5] } })
    const levels = [-19, -20, -21, -20.5, -19.5, -20]
    const strings = [6, 5, 4, 3, 2, 1].map((stringNo) => ({
      stringNo,
      levelDb: levels[stringNo - 1]!,
      scatterDb: 0.4,
    }))
    const view = runCheck(setup, buildCheck({ setup, strings, jitterDb: 0 }))
    const deviations = levels.map((level, i) => level + 20 - setup.sheet.patternDb![i]!)
    view.strings.forEach((string, i) => {
      expect(string.level.value).toBeCloseTo(levels[i]!, 2)
      expect(string.balance.value).toBeCloseTo(deviations[i]!, 2)
      expect(string.sDb).toBeCloseTo(0.4, 3)
      expect(string.level.n).toBe(3)
    })
    expect(view.referenceDb).toBeCloseTo(-20, 2)
    expect(view.range.value).toBeCloseTo(Math.max(...deviations) - Math.min(...deviations), 2)
    expect(view.step.value).toBeCloseTo(1.5, 2)
    expect(view.meanLevel.value).toBeCloseTo(0, 2)
  })

  it('gives the same view however its frames were batched, bit for bit', () => {
    const setup = buildSetup()
    const { frames, events } = buildCheck({ setup, disturbances: [{ ms: 900, durationMs: 2 }] })
    const sent = byFrame({ frames, events })
    const whole = JSON.stringify(viewRun(replayRun(setup, frames, events, [])))
    for (const size of [1, 7, 200]) {
      const state = startRun(setup)
      for (let from = 0; from < frames.length; from += size) {
        const batch = frames.slice(from, from + size)
        batch.forEach((frame, i) => takeFrame(state, frame, sent[from + i]!))
        // looking at a run between batches must not change it
        viewRun(state)
      }
      expect(JSON.stringify(viewRun(state))).toBe(whole)
    }
  })

  it('shows a view that satisfies the contract after every change', () => {
    const setup = buildSetup()
    const { frames, events } = buildCheck({
      setup,
      strings: soundStrings(-20, 3),
      noiseDb: -Infinity,
      noiseADb: -Infinity,
    })
    const sent = byFrame({ frames, events })
    const state = startRun(setup)
    let seen = -1
    let views = 0
    frames.forEach((frame, i) => {
      takeFrame(state, frame, sent[i]!)
      if (changeCount(state) === seen) return
      seen = changeCount(state)
      const view = viewRun(state)
      expect(MeasuredRun.safeParse(view).error).toBeUndefined()
      // JSON turns what is not finite into null: nothing may change on the way
      expect(JSON.parse(JSON.stringify(view))).toEqual(view)
      views++
    })
    expect(views).toBeGreaterThan(40)
  })

  it('takes no more frames when it is done', () => {
    const setup = buildRecordingSetup()
    const { frames, events } = buildCheck({ setup })
    const state = replayRun(setup, frames, events, [])
    const before = JSON.stringify(viewRun(state))
    for (const frame of frames.slice(0, 500)) takeFrame(state, frame, [])
    expect(JSON.stringify(viewRun(state))).toBe(before)
  })

  it('gives a common 10 dB to levels and mean level and to no balance', () => {
    const setup = buildSetup()
    const strings = soundStrings(-25)
    const quiet = runCheck(setup, buildCheck({ setup, strings, noiseDb: -Infinity, noiseADb: -Infinity }))
    const louder = strings.map((string) => ({ ...string, levelDb: string.levelDb + 10 }))
    const loud = runCheck(
      setup,
      buildCheck({ setup, strings: louder, noiseDb: -Infinity, noiseADb: -Infinity }),
    )
    quiet.strings.forEach((string, i) => {
      expect(loud.strings[i]!.level.value! - string.level.value!).toBeCloseTo(10, 2)
      expect(Math.abs(loud.strings[i]!.balance.value! - string.balance.value!)).toBeLessThan(1e-9)
    })
    expect(loud.meanLevel.value! - quiet.meanLevel.value!).toBeCloseTo(10, 2)
  })

  it('passes no instrument on a sheet that requires nothing', () => {
    const { rules } = buildSetup().sheet
    const setup = buildSetup({ sheet: { rules: rules.map((rule) => ({ ...rule, required: false })) } })
    const view = runCheck(setup, buildCheck({ setup }))
    expect(view.results.every((result) => result.result === 'within')).toBe(true)
    expect(view).toMatchObject({ phase: 'done', verdict: 'none' })
  })

  it('is judged by nobody on a bench that is not verified, whatever it shows', () => {
    const setup = buildSetup({ verified: false })
    const view = runCheck(setup, buildCheck({ setup }))
    expect(view.verdict).toBe('none')
    expect(view.warnings).toContain('benchNotVerified')
    expect(
      view.results.filter((result) => result.required).every((result) => result.result === 'within'),
    ).toBe(true)
  })
})

describe('plugging in', () => {
  const setup = buildSetup()

  it('asks to leave the plug out, watches half a second, then asks for it', () => {
    const trace = new TraceBuilder(setup).setPlug(true).run(300).setPlug(false).run(480)
    const state = replayRun(setup, trace.frames, [], [])
    expect(promptOf(state).prompt).toBe('leaveUnplugged')
    for (const frame of new TraceBuilder(setup).setPlug(false).run(20).frames) takeFrame(state, frame, [])
    expect(promptOf(state).prompt).toBe('plugIn')
    expect(phaseOf(state)).toBe('unplugged')
    for (const frame of new TraceBuilder(setup).run(10).frames) takeFrame(state, frame, [])
    expect(phaseOf(state)).toBe('settle')
    expect(viewRun(state).jack.unpluggedOpen).toBe(true)
  })

  it('finds a switch that stays closed and a preamp that stays on', () => {
    const trace = buildCheck({ setup })
    const stuck = {
      ...trace,
      frames: trace.frames.map((frame) =>
        frame.plugged === false ? { ...frame, ringSleeveClosed: true, currentUa: 1100 } : frame,
      ),
    }
    const view = runCheck(setup, stuck)
    expect(resultOf(view, 'switchOpen')).toMatchObject({ result: 'outside', value: 0 })
    expect(resultOf(view, 'currentUnplugged')).toMatchObject({ result: 'outside', value: 1100, unit: 'uA' })
    expect(view.verdict).toBe('fail')
  })

  it('does not believe a tip that is closed while the plug is out', () => {
    const trace = buildCheck({ setup })
    const frames = trace.frames.map((frame) =>
      frame.plugged === false ? { ...frame, tipClosed: true } : frame,
    )
    const view = runCheck(setup, { ...trace, frames })
    expect(resultOf(view, 'switchOpen')).toMatchObject({ result: 'invalid', why: 'disagreesWithState' })
    expect(view.verdict).toBe('none')
  })

  it('waits until the floor drifts no more, and not for ever', () => {
    const settledAfter = (driftDbPerS: number) => {
      const trace = new TraceBuilder(setup, { jitterDb: 0 }).setPlug(false).run(600).setPlug(true).run(20_000)
      trace.frames.slice(60).forEach((frame, i) => {
        const lifted = Math.round(-80_000 - driftDbPerS * Math.min(i, 1800) * 10)
        frame.levelMdb = frame.levelMdb.map(() => lifted)
      })
      const begins = (phase: RunPhase) => phasesThrough(setup, trace).find(([name]) => name === phase)![1]
      return (begins('jackRest') - begins('settle')) * setup.frameMs
    }
    // the frame that showed the plug is the last of the phase before
    expect(settledAfter(0.05)).toBe(3000)
    expect(settledAfter(0.3)).toBe(15_000)
  })

  it('reads supply and battery at rest, plugged', () => {
    const view = runCheck(setup, buildCheck({ setup }))
    expect(view.supply).toEqual({ pluggedMa: 1.2, unpluggedUa: 0, batteryV: 9.2 })
    expect(view.jack).toMatchObject({ pluggedClosed: true, tipSteady: true })
  })

  it('warns of a low battery and fails it', () => {
    const trace = buildCheck({ setup })
    const view = runCheck(setup, {
      ...trace,
      frames: trace.frames.map((frame) => ({ ...frame, batteryMv: 6900 })),
    })
    expect(view.warnings).toContain('batteryLow')
    expect(resultOf(view, 'battery')).toMatchObject({ result: 'outside', value: 6.9 })
  })
})

describe('the muted stretch', () => {
  const setup = buildRecordingSetup()

  it('is found by itself, after what disturbs it', () => {
    const trace = new TraceBuilder(setup)
    trace.run(600)
    trace.pluck(6, { levelDb: -30, ringMs: 700 })
    const end = trace.at - 40
    trace.run(2600)
    const view = runCheck(setup, trace)
    expect(view.phase).toBe('strings')
    expect(view.plucks).toHaveLength(0)
    expect(view.noise.fromFrame).toBeGreaterThanOrEqual(end)
    expect(view.noise.toFrame! - view.noise.fromFrame! + 1).toBe(200)
    expect(view.noise.flat.value).toBeCloseTo(-80, 1)
    expect(view.noise.a.value).toBeCloseTo(-88, 1)
  })

  it('starts again after a break', () => {
    const trace = new TraceBuilder(setup).run(1600).happen('discontinuity').run(1800)
    expect(runCheck(setup, trace).phase).toBe('noise')
    trace.run(400)
    expect(runCheck(setup, trace)).toMatchObject({ phase: 'strings', noise: { fromFrame: 160 } })
  })

  it('is energy mean, not mean of dB', () => {
    const trace = new TraceBuilder(setup, { jitterDb: 0 }).run(2600)
    trace.frames.forEach((frame, i) => {
      frame.levelMdb = frame.levelMdb.map(() => (i % 2 === 0 ? -80_000 : -90_000))
    })
    expect(runCheck(setup, trace).noise.flat.value).toBeCloseTo(10 * Math.log10((1e-8 + 1e-9) / 2), 9)
  })

  it('is at most the bench own floor when there is digital silence', () => {
    const trace = new TraceBuilder(setup, { noiseDb: -Infinity, noiseADb: -Infinity }).run(2600)
    expect(trace.frames[0]!.levelMdb[0]).toBe(SILENCE_MDB)
    const view = runCheck(setup, trace)
    expect(view.noise.flat).toMatchObject({ value: -100, atMost: true })
    expect(resultOf(view, 'noiseFlat')).toMatchObject({ result: 'within', atMost: true })
  })

  it('is the latest stretch of an instrument that crackles, after half a minute, and fails it', () => {
    const noisy = buildRecordingSetup('six', {
      rules: [sheetRule('noiseFlat', { high: -70, onOutside: 'reject', required: true })],
    })
    const trace = new TraceBuilder(noisy, { noiseDb: -85 }).run(31_000)
    for (let i = 100; i < trace.frames.length; i += 90) trace.frames[i]!.levelMdb[2] = -40_000
    const early = replayRun(noisy, trace.frames.slice(0, 1000), [], [])
    expect(viewRun(early)).toMatchObject({
      phase: 'noise',
      warnings: expect.arrayContaining(['notYetQuiet']) as unknown,
    })
    const view = runCheck(noisy, trace)
    expect(view.noise).toMatchObject({ at: 3 })
    expect(resultOf(view, 'noiseFlat').result).toBe('outside')
  })

  it('lasts 5 s when hum is judged, and waits for the hum of that stretch', () => {
    const humming = buildSetup({ sheet: { rules: [sheetRule('hum')] } })
    expect(noiseStretchMsOf(humming)).toBe(5000)
    expect(noiseStretchMsOf(buildSetup())).toBe(2000)
    const trace = new TraceBuilder(humming).run(9000)
    // before the stretch: does not count
    trace.events.push({
      kind: 'hum',
      frame: 10,
      startTenthMs: 0,
      durationTenthMs: 20_000,
      channel: 0,
      mainsHz: 50,
      levelMdb: -40_000,
    })
    trace.frames[250]!.levelMdb[0] = -30_000
    expect(runCheck(humming, trace)).toMatchObject({ phase: 'noise', noise: { hum: { value: null } } })
    const check = buildCheck({ setup: humming, humDb: -79 })
    const view = runCheck(humming, check)
    expect(view.noise.hum).toMatchObject({ value: -79, unit: 'dBV', n: 1 })
    expect(resultOf(view, 'hum').result).toBe('within')
    expect(view.noise.toFrame! - view.noise.fromFrame! + 1).toBe(500)
  })

  it('is read at the jack where there is one, else at the loudest element', () => {
    const atJack = buildSetup()
    const jack = runCheck(atJack, buildCheck({ setup: atJack, noiseDb: -82, jackNoiseDb: -75 }))
    expect(jack.noise.at).toBe(0)
    expect(jack.noise.flat.value).toBeCloseTo(-75, 1)
    const trace = buildCheck({ setup })
    const frames = trace.frames.map((frame) => ({
      ...frame,
      levelMdb: frame.levelMdb.map((mdb, i) => (i === 4 && mdb < -60_000 ? mdb + 4000 : mdb)),
    }))
    expect(runCheck(setup, { ...trace, frames }).noise).toMatchObject({ at: 5 })
  })
})

describe('S/N', () => {
  it('is the worst of six, both terms flat or both A', () => {
    const setup = buildSetup()
    const strings = soundStrings(-20, 0.5).map((string) =>
      string.stringNo === 2 ? { ...string, levelDb: -24 } : string,
    )
    const view = runCheck(setup, buildCheck({ setup, strings, noiseDb: -80, noiseADb: -90, jitterDb: 0 }))
    expect(view.snFlat.value).toBeCloseTo(56, 1)
    expect(view.snA.value).toBeCloseTo(66, 1)
  })

  it('is not tested A-weighted when a bench does not weigh', () => {
    const setup = buildSetup({
      capabilities: SIX_CHANNEL.filter((capability) => capability !== 'noiseA'),
      sheet: { rules: [sheetRule('speaks'), sheetRule('snA')] },
    })
    const view = runCheck(setup, buildCheck({ setup }))
    expect(resultOf(view, 'snA')).toMatchObject({ result: 'notTested', why: 'notMeasurable', value: null })
    expect(view.warnings).toContain('ruleNotMeasurable')
    expect(view.verdict).toBe('none')
  })
})

describe('the wiggle', () => {
  const setup = buildSetup()
  const disturbed = (disturbances: { ms: number; durationMs: number }[]) =>
    runCheck(setup, buildCheck({ setup, disturbances }))

  it('begins by itself after 4 s, and counts disturbances and the longest', () => {
    const view = disturbed([
      { ms: 1000, durationMs: 0.4 },
      { ms: 3000, durationMs: 3.5 },
    ])
    expect(view.jack).toMatchObject({
      disturbanceCount: 2,
      disturbanceLongestMs: 3.5,
      wiggleStartedBy: 'itself',
    })
    expect(resultOf(view, 'disturbanceCount')).toMatchObject({ result: 'outside', value: 2 })
    expect(resultOf(view, 'disturbanceLongest')).toMatchObject({ result: 'outside', value: 3.5 })
    expect(view.verdict).toBe('fail')
  })

  it('counts only what starts inside it', () => {
    const trace = buildCheck({ setup })
    const [, wiggleFrom] = phasesThrough(setup, trace).find(([phase]) => phase === 'wiggle')!
    const at = (ms: number): BenchEvent => ({
      kind: 'disturbance',
      pole: 'tip',
      frame: wiggleFrom + Math.max(-1, Math.floor(ms / 10)),
      startTenthMs: wiggleFrom * 100 + ms * 10,
      durationTenthMs: 10,
    })
    const count = (ms: number) =>
      runCheck(setup, { ...trace, events: [...trace.events, at(ms)] }).jack.disturbanceCount
    expect([-1, 0, 4999, 5000, 5100].map(count)).toEqual([0, 1, 1, 0, 0])
  })

  it('is begun by the foot switch', () => {
    const trace = buildCheck({ setup })
    const [, readyFrom] = phasesThrough(setup, trace).find(([phase]) => phase === 'wiggleReady')!
    const pedal: BenchEvent = { kind: 'pedal', frame: readyFrom + 50, startTenthMs: 0, durationTenthMs: 0 }
    const view = runCheck(setup, { ...trace, events: [...trace.events, pedal] })
    expect(view.jack.wiggleStartedBy).toBe('pedal')
    expect(view.phase).toBe('done')
  })

  it('starts again when the bench restarts in it, and keeps what was seen', () => {
    const trace = buildCheck({ setup, disturbances: [{ ms: 500, durationMs: 2 }] })
    const [, wiggleFrom] = phasesThrough(setup, trace).find(([phase]) => phase === 'wiggle')!
    const broken: BenchEvent = {
      kind: 'discontinuity',
      frame: wiggleFrom + 200,
      startTenthMs: 0,
      durationTenthMs: 0,
    }
    const more = new TraceBuilder(setup).run(3000).frames
    const state = replayRun(setup, trace.frames, [...trace.events, broken], [])
    expect(phaseOf(state)).toBe('wiggle')
    for (const frame of more) takeFrame(state, frame, [])
    expect(isFinished(state)).toBe(true)
    expect(viewRun(state).jack.disturbanceCount).toBe(1)
  })

  it('finds a tip that opens, at rest or in it', () => {
    const trace = buildCheck({ setup })
    const [, wiggleFrom] = phasesThrough(setup, trace).find(([phase]) => phase === 'wiggle')!
    trace.frames[wiggleFrom + 100]!.tipClosed = false
    const view = runCheck(setup, trace)
    expect(resultOf(view, 'tipContinuity')).toMatchObject({ result: 'outside', value: 0 })
  })
})

describe('contacts and insulation', () => {
  const setup = buildSetup({
    capabilities: [...SIX_CHANNEL, 'contactResistance', 'insulation'],
    sheet: {
      rules: (['speaks', 'contactTip', 'contactRing', 'contactSleeve', 'insulation'] as const).map((rule) =>
        sheetRule(rule),
      ),
    },
  })

  it('take the worst report, not while the contact moves', () => {
    const trace = buildCheck({ setup })
    const [, rest] = phasesThrough(setup, trace).find(([phase]) => phase === 'jackRest')!
    const contact = (pole: 'tip' | 'ring' | 'sleeve', microOhm: number, frame = rest + 20): BenchEvent => ({
      kind: 'contact',
      pole,
      microOhm,
      frame,
      startTenthMs: frame * 100,
      durationTenthMs: 0,
    })
    const insulation: BenchEvent = {
      kind: 'insulation',
      testMillivolt: 5000,
      kiloOhm: 500_000,
      frame: rest + 30,
      startTenthMs: 0,
      durationTenthMs: 0,
    }
    const events = [
      ...trace.events,
      contact('tip', 20_000),
      contact('tip', 35_000),
      contact('tip', 900_000, rest - 100),
      contact('ring', 150_000),
      insulation,
    ]
    const view = runCheck(setup, { ...trace, events })
    expect(view.jack).toMatchObject({
      contactTipOhm: 0.035,
      contactRingOhm: 0.15,
      contactSleeveOhm: null,
      insulationMohm: 500,
    })
    expect(resultOf(view, 'contactTip').result).toBe('within')
    expect(resultOf(view, 'contactRing').result).toBe('outside')
    expect(resultOf(view, 'contactSleeve')).toMatchObject({ result: 'notTested', why: 'notReached' })
    expect(resultOf(view, 'insulation')).toMatchObject({ result: 'within', value: 500 })
  })
})

describe('the end of a recording', () => {
  const setup = buildRecordingSetup()

  it('leaves what it did not hold untested, and gives no verdict', () => {
    const strings = soundStrings()
      .slice(0, 4)
      .map((string, i) => (i === 3 ? { ...string, plucks: 2 } : string))
    const view = runCheck(setup, buildCheck({ setup, strings, endOfSource: true }))
    expect(view.phase).toBe('done')
    expect(view.verdict).toBe('none')
    expect(resultOf(view, 'balance', 6).result).toBe('within')
    expect(resultOf(view, 'balance', 3)).toMatchObject({ result: 'invalid', why: 'tooFewPlucks' })
    expect(resultOf(view, 'balance', 1)).toMatchObject({ result: 'notTested', why: 'notReached' })
    expect(resultOf(view, 'range')).toMatchObject({ result: 'notTested', value: null })
  })

  it('within the muted stretch leaves everything untested', () => {
    const trace = new TraceBuilder(setup).run(1000).happen('endOfSource').run(10)
    const view = runCheck(setup, trace)
    expect(view).toMatchObject({ phase: 'done', verdict: 'none' })
    expect(view.results.every((result) => result.result === 'notTested')).toBe(true)
  })
})

describe('warnings', () => {
  it('name fresh strings, controls that are not set and a pattern that is not set', () => {
    const warningsOf = (setup: RunSetup) => viewRun(startRun(setup)).warnings
    expect(warningsOf(buildSetup())).toEqual([])
    expect(warningsOf(buildSetup({ conditions: { strungMinutes: 9.9 } }))).toEqual(['stringsFresh'])
    expect(warningsOf(buildSetup({ conditions: { strungMinutes: 10 } }))).toEqual([])
    expect(warningsOf(buildSetup({ conditions: { strungMinutes: null } }))).toEqual([])
    expect(warningsOf(buildSetup({ conditions: { controlsSet: false } }))).toEqual(['controlsNotSet'])
    expect(warningsOf(buildSetup({ sheet: { patternDb: null } }))).toEqual(['patternNotSet'])
    expect(warningsOf(buildSetup({ sheet: { patternInstruments: 9 } }))).toEqual(['patternNotSet'])
    expect(warningsOf(buildSetup({ channelKind: 'one', capabilities: ONE_CHANNEL }))).toEqual([])
  })
})

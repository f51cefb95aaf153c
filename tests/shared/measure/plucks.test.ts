import { describe, expect, it } from 'vitest'
import { NOT_MEASURED_MDB } from '../../../src/shared/contract/quantities.ts'
import type { RunSetup } from '../../../src/shared/contract/runs.ts'
import {
  buildAction,
  buildModel,
  buildRecordingSetup,
  OPEN_HZ,
  RECORDING_SIX,
} from '../../helpers/runSetup.ts'
import { runCheck } from '../../helpers/runCheck.ts'
import { TraceBuilder, type PluckOptions, type TraceOptions } from '../../helpers/traceBuilder.ts'

const hzOf = (stringNo: number) => OPEN_HZ[stringNo - 1]!

/** A recording set-up with its muted stretch behind it, ready for plucks. */
function afterNoise(setup: RunSetup = buildRecordingSetup(), options: TraceOptions = {}) {
  const trace = new TraceBuilder(setup, { jitterDb: 0, ...options }).run(2600)
  return { setup, trace, view: () => runCheck(setup, trace) }
}

/** The one pluck that a trace of one excitation gives. */
function onePluck(stringNo: number, options: PluckOptions, setup?: RunSetup) {
  const { trace, view } = afterNoise(setup)
  const onset = trace.pluck(stringNo, options)
  const { plucks } = view()
  expect(plucks).toHaveLength(1)
  expect(plucks[0]!.onsetFrame).toBe(onset)
  return plucks[0]!
}

const withoutPitch = () => ({
  ...buildRecordingSetup(),
  capabilities: RECORDING_SIX.filter((capability) => capability !== 'pitch'),
})

describe('pluck level', () => {
  it.each([5, 10] as const)(
    'is the energy mean over 50 to 250 ms after the onset, frames of %d ms',
    (frameMs) => {
      const setup = { ...buildRecordingSetup(), frameMs }
      const { trace, view } = afterNoise(setup, { noiseDb: -Infinity })
      const onset = trace.pluck(6, { levelDb: -20, decayDbPerS: 29 })
      const [from, to] = [onset + 50 / frameMs, onset + 250 / frameMs]
      const powers = trace.frames.slice(from, to).map((frame) => Math.pow(10, frame.levelMdb[5]! / 10_000))
      expect(powers).toHaveLength(200 / frameMs)
      const expected = 10 * Math.log10(powers.reduce((sum, power) => sum + power, 0) / powers.length)
      expect(view().plucks[0]!.rawDb).toBeCloseTo(expected, 9)
      expect(expected).toBeCloseTo(-20, 2)
    },
  )

  it('takes the noise of its own channel off, after ISO 3744', () => {
    const pluck = onePluck(3, { levelDb: -70, decayDbPerS: 0, crosstalkDb: Infinity })
    // -70 over noise at -80: the sum stands 10.41 dB above the noise
    expect(pluck.rawDb).toBeCloseTo(10 * Math.log10(1e-7 + 1e-8), 2)
    expect(pluck.levelDb).toBeCloseTo(-70, 2)
  })

  it('adds the calibration of its channel', () => {
    const setup = { ...buildRecordingSetup(), calibrationDb: [0, 0, 12.5, 0, 0, 0] }
    expect(onePluck(3, { levelDb: -20 }, setup).levelDb).toBeCloseTo(-20, 2)
  })

  it('of a six-channel bench carries its separation from the loudest other element', () => {
    expect(onePluck(4, { levelDb: -20, crosstalkDb: 25 }).separationDb).toBeCloseTo(25, 2)
  })

  it('of a one-channel bench is read at the jack and has no separation', () => {
    const pluck = onePluck(2, { levelDb: -18 }, buildRecordingSetup('one'))
    expect(pluck).toMatchObject({ stringNo: 2, toldBy: 'pitch', separationDb: null, dropped: null })
    expect(pluck.levelDb).toBeCloseTo(-18, 2)
  })
})

describe('onset', () => {
  it('is the first frame that stands 10 dB above the channel own floor, not one that stands less', () => {
    const { trace, view } = afterNoise()
    trace.pluck(6, { levelDb: -71.5, decayDbPerS: 0, crosstalkDb: Infinity })
    trace.pluck(6, { levelDb: -69, decayDbPerS: 0, crosstalkDb: Infinity })
    // -71.5 and -69 over -80 are 9.07 and 11.33 dB above the floor
    expect(view().plucks).toHaveLength(1)
  })

  it('does not look below the bench own noise floor', () => {
    const setup = { ...buildRecordingSetup(), floorDb: [-60, -60, -60, -60, -60, -60] }
    const { trace, view } = afterNoise(setup)
    trace.pluck(6, { levelDb: -55, decayDbPerS: 0, crosstalkDb: Infinity })
    trace.pluck(6, { levelDb: -45, decayDbPerS: 0, crosstalkDb: Infinity })
    expect(view().plucks.map((pluck) => pluck.levelDb)).toHaveLength(1)
  })

  it('needs half of the floor frames: none right after a break', () => {
    const { trace, view } = afterNoise()
    trace.run(500).happen('discontinuity').run(60)
    trace.pluck(6, { levelDb: -20, hz: null })
    expect(view().plucks).toHaveLength(0)
  })
})

describe('which string it was', () => {
  it('is told by pitch before all else', () => {
    // crossed leads: string 3 sounds on the element of string 2
    expect(onePluck(2, { levelDb: -20, hz: hzOf(3) })).toMatchObject({ stringNo: 3, toldBy: 'pitch' })
  })

  it('is told by the element that leads by 6 dB without a pitch', () => {
    expect(onePluck(4, { levelDb: -20, crosstalkDb: 6.1 }, withoutPitch())).toMatchObject({
      stringNo: 4,
      toldBy: 'lead',
      dropped: null,
    })
  })

  it('is the string asked for when none leads, marked by prompt', () => {
    expect(onePluck(4, { levelDb: -20, crosstalkDb: 5 }, withoutPitch())).toMatchObject({
      stringNo: 6,
      toldBy: 'prompt',
    })
    const one = { ...buildRecordingSetup('one'), capabilities: ['jackLevel' as const] }
    expect(onePluck(2, { levelDb: -20 }, one)).toMatchObject({ stringNo: 6, toldBy: 'prompt', milliHz: null })
  })

  it('does not trust a pitch of less than half confidence', () => {
    expect(onePluck(4, { levelDb: -20, hz: hzOf(1), confidencePercent: 49 })).toMatchObject({
      stringNo: 4,
      toldBy: 'lead',
    })
    expect(onePluck(4, { levelDb: -20, hz: hzOf(1), confidencePercent: 50 })).toMatchObject({ stringNo: 1 })
  })

  it('does not take a string that only answers for a second one', () => {
    // string 1 rings with the fourth harmonic of string 6, far down
    const { trace, view } = afterNoise()
    const onset = trace.pluck(6, { levelDb: -20, crosstalkDb: 30 })
    trace.event({
      kind: 'pitch',
      frame: onset + 20,
      startTenthMs: onset * 100 + 600,
      durationTenthMs: 1200,
      channel: 1,
      milliHz: Math.round(hzOf(1) * 1000),
      confidencePercent: 95,
    })
    expect(view().plucks[0]).toMatchObject({ stringNo: 6, dropped: null })
  })

  it('takes a pitch that a note before it still reports for that note', () => {
    const { trace, view } = afterNoise()
    const onset = trace.at + 40
    trace.event({
      kind: 'pitch',
      frame: onset,
      startTenthMs: (onset - 30) * 100,
      durationTenthMs: 3200,
      channel: 0,
      milliHz: Math.round(hzOf(5) * 1000),
      confidencePercent: 95,
    })
    trace.run(400).pluck(6, { levelDb: -20 })
    expect(view().plucks[0]).toMatchObject({ stringNo: 6, dropped: null })
  })

  it('takes the two pitches of a course for one string', () => {
    const tuning = buildModel().tuning.map((pitch) =>
      pitch.stringNo === 6 ? { ...pitch, pitchesHz: [82.41, 164.81] } : pitch,
    )
    const setup = {
      ...buildRecordingSetup(),
      model: buildModel({ strings: 'twelve', tuning, isRecording: true }),
    }
    expect(onePluck(6, { levelDb: -20, secondHz: 164.81 }, setup)).toMatchObject({
      stringNo: 6,
      dropped: null,
    })
  })
})

describe('a pluck is dropped', () => {
  it('as a strum for two pitches of two strings', () => {
    expect(onePluck(5, { levelDb: -20, secondHz: hzOf(4) })).toMatchObject({
      dropped: 'strum',
      stringNo: null,
    })
  })

  it.each([90, 150, 220])('for a second onset %d ms after the first', (secondOnsetMs) => {
    expect(onePluck(5, { levelDb: -20, secondOnsetMs }).dropped).toBe('secondOnset')
  })

  it('for clipping in its window', () => {
    expect(onePluck(5, { levelDb: -3, clipped: 2 }).dropped).toBe('clipped')
  })

  it('for a pitch off by more than half a semitone, and not for less', () => {
    const cents = (n: number) => hzOf(5) * Math.pow(2, n / 1200)
    expect(onePluck(5, { levelDb: -20, hz: cents(51) })).toMatchObject({ dropped: 'wrongPitch', stringNo: 5 })
    expect(onePluck(5, { levelDb: -20, hz: cents(-51) }).dropped).toBe('wrongPitch')
    expect(onePluck(5, { levelDb: -20, hz: cents(49) }).dropped).toBeNull()
    expect(onePluck(5, { levelDb: -20, hz: cents(-49) }).dropped).toBeNull()
  })

  it('as not damped when the string still rang, though the rise is no 10 dB onset', () => {
    const { trace, view } = afterNoise()
    trace.pluck(6, { levelDb: -20, decayDbPerS: 5, ringMs: 1000, undamped: true })
    trace.pluck(6, { levelDb: -20, decayDbPerS: 5, ringMs: 1000 })
    const { plucks } = view()
    expect(plucks.map((pluck) => pluck.dropped)).toEqual([null, 'notDamped'])
    expect(plucks[1]!.stringNo).toBe(6)
  })

  it('as not damped when a new onset stands less than 20 dB above what rang', () => {
    const { trace, view } = afterNoise()
    trace.pluck(6, { levelDb: -40, decayDbPerS: 2, ringMs: 1000, undamped: true })
    trace.pluck(6, { levelDb: -25, decayDbPerS: 2, ringMs: 1000 })
    expect(view().plucks.map((pluck) => pluck.dropped)).toEqual([null, 'notDamped'])
  })

  it('but not when it stands 20 dB above: the residue costs 0.04 dB', () => {
    const { trace, view } = afterNoise()
    trace.pluck(6, { levelDb: -50, decayDbPerS: 2, ringMs: 1000, undamped: true })
    trace.pluck(6, { levelDb: -25, decayDbPerS: 2, ringMs: 1000 })
    const { plucks } = view()
    expect(plucks[1]!.dropped).toBeNull()
    expect(Math.abs(plucks[1]!.levelDb! + 25)).toBeLessThan(0.04)
  })

  it('for a window with a frame that was not measured', () => {
    const { trace, setup, view } = afterNoise()
    const onset = trace.pluck(6, { levelDb: -20 })
    trace.frames[onset + 12]!.levelMdb[5] = NOT_MEASURED_MDB
    expect(view().plucks[0]).toMatchObject({ dropped: 'shortWindow', levelDb: null, rawDb: null })
    expect(setup.frameMs).toBe(10)
  })

  it('for a recording that ends within its window', () => {
    const { trace, view } = afterNoise()
    trace.pluck(6, { levelDb: -20, ringMs: 200, restMs: 0 })
    trace.happen('endOfSource').run(10)
    expect(view().plucks.map((pluck) => pluck.dropped)).toEqual(['shortWindow'])
  })

  it('but not for one that ends just after it', () => {
    const { trace, view } = afterNoise()
    trace.pluck(6, { levelDb: -20, ringMs: 250, restMs: 0 })
    trace.happen('endOfSource').run(10)
    expect(view().plucks.map((pluck) => pluck.dropped)).toEqual([null])
  })

  it('as interrupted when the bench restarts within it', () => {
    const { trace, view } = afterNoise()
    trace.pluck(6, { levelDb: -20, ringMs: 150, restMs: 0 })
    trace.happen('discontinuity').damp(600)
    expect(view().plucks.map((pluck) => pluck.dropped)).toEqual(['interrupted'])
  })

  it('as below the floor when only other elements heard it, with the bound', () => {
    const pluck = onePluck(4, { levelDb: -20, ownSilent: true })
    expect(pluck).toMatchObject({ dropped: 'belowFloor', stringNo: 4, toldBy: 'pitch', atMost: true })
    expect(pluck.levelDb).toBeCloseTo(-74, 6)
  })

  it('as below the floor, of no string, when nothing sounds over its window: a bump', () => {
    const pluck = onePluck(4, { levelDb: -20, ringMs: 40, restMs: 500, hz: null })
    expect(pluck).toMatchObject({ dropped: 'belowFloor', stringNo: null })
  })

  it('as string done when that string has what it needs', () => {
    const { trace, view } = afterNoise()
    for (let i = 0; i < 4; i++) trace.pluck(6, { levelDb: -20 + i / 10 })
    const { plucks, strings } = view()
    expect(plucks.map((pluck) => pluck.dropped)).toEqual([null, null, null, 'stringDone'])
    expect(strings[5]).toMatchObject({ accepted: 3, tries: 3 })
  })

  it('as set aside when a person repeats the string', () => {
    const { trace, setup } = afterNoise()
    for (let i = 0; i < 3; i++) trace.pluck(6, { levelDb: -20 + i / 10 })
    const actions = [buildAction({ kind: 'repeatString', stringNo: 6, reason: 'pick slipped' }, trace.at)]
    const { plucks, strings } = runCheck(setup, trace, actions)
    expect(plucks.map((pluck) => pluck.dropped)).toEqual(['setAside', 'setAside', 'setAside'])
    expect(plucks.every((pluck) => pluck.levelDb !== null)).toBe(true)
    expect(strings[5]).toMatchObject({ accepted: 0, tries: 0, repeated: true, repeatReason: 'pick slipped' })
  })
})

import { describe, expect, it } from 'vitest'
import type { FrameMs } from '../../../src/shared/contract/frames.ts'
import type { Capability } from '../../../src/shared/contract/rules.ts'
import type { MeasuredRun, Pluck } from '../../../src/shared/contract/measured.ts'
import { STRING_NOS } from '../../../src/shared/contract/quantities.ts'
import { isFinished, startRun, takeFrame, viewRun } from '../../../src/shared/measure/runState.ts'
import type { RecordingKind } from '../../../simulator/recordings/proofRecordings.ts'
import { WavSource } from '../../../simulator/sources/wavSource.ts'
import { RECORDING_ORDER, recordings } from '../../helpers/recordings.ts'
import { buildRecordingSetup, sheetRule } from '../../helpers/runSetup.ts'

const proof = recordings()

/** A recording through the WAV source and the run's state, as the server does it, without server and database. */
function measure(kind: RecordingKind, frameMs: FrameMs = 10): MeasuredRun {
  const source = new WavSource(proof.file[kind], { frameMs })
  const rules = [
    sheetRule('speaks'),
    ...(['balance', 'range', 'step', 'noiseFlat', 'noiseA', 'snFlat'] as const).map((rule) =>
      sheetRule(rule, { onOutside: 'advise', required: false }),
    ),
  ]
  const setup = {
    ...buildRecordingSetup(source.channelKind, { rules, patternDb: null, patternInstruments: 0 }),
    capabilities: [...source.capabilities] as Capability[],
    algorithms: source.algorithms,
    frameMs,
  }
  const state = startRun(setup)
  source.start(RECORDING_ORDER)
  for (let frameNo = 0; !isFinished(state); frameNo++) {
    const step = source.next(frameNo)
    if (typeof step === 'string') break
    takeFrame(state, step.frame, step.events)
  }
  void source.close()
  return viewRun(state)
}

const droppedBecause = (plucks: readonly Pluck[], stringNo: number) =>
  plucks.filter((pluck) => pluck.stringNo === stringNo).map((pluck) => pluck.dropped)
const resultOf = (run: MeasuredRun, stringNo: number) =>
  run.results.find((result) => result.rule === 'speaks' && result.stringNo === stringNo)

describe.each([
  ['sixChannels', 6, 10],
  ['oneChannel', 1, 10],
  ['oneChannel', 1, 5],
] as const)('the recording %s on %i channels in frames of %i ms, measured', (kind, channels, frameMs) => {
  const run = measure(kind, frameMs)

  it('names every string by its pitch, keeps all 18 plucks and passes', () => {
    expect(run.plucks.map(({ stringNo, toldBy, dropped }) => ({ stringNo, toldBy, dropped }))).toEqual(
      proof.plucks[kind].map(({ stringNo }) => ({ stringNo, toldBy: 'pitch', dropped: null })),
    )
    expect(run.phase).toBe('done')
    expect(run.verdict).toBe('pass')
  })

  it('has balances within 0.10 dB of what sox says, and a scatter within 0.10 dB of 1.00', () => {
    for (const [i, { balance, sDb, accepted, inReference }] of run.strings.entries()) {
      expect(accepted).toBe(3)
      expect(inReference).toBe(true)
      expect(Math.abs(balance.value! - proof.expectedBalanceDb[i]!)).toBeLessThan(0.1)
      expect(Math.abs(sDb! - 1)).toBeLessThan(0.1)
    }
  })

  it('has levels within 0.10 dB of sox and a noise floor of -80 dB', () => {
    for (const [i, { level }] of run.strings.entries())
      expect(Math.abs(level.value! - proof.expectedLevelDb[i]!)).toBeLessThan(0.1)
    expect(Math.abs(run.noise.flat.value! + 80)).toBeLessThan(0.2)
  })

  it(channels === 6 ? 'has a channel separation of the noise only' : 'has no channel separation', () => {
    for (const { separation } of run.strings)
      if (channels === 6) expect(separation.value!).toBeGreaterThan(50)
      else expect(separation.value).toBeNull()
  })
})

describe('the second set of recordings, measured', () => {
  it('gives no verdict to digital silence: nothing was tested', () => {
    const run = measure('digitalSilence')
    expect(run.verdict).toBe('none')
    expect(run.plucks).toEqual([])
    for (const no of STRING_NOS) expect(resultOf(run, no)).toMatchObject({ result: 'notTested' })
  })

  it('drops every pluck that clips, by name, and gives no verdict', () => {
    const run = measure('clipping')
    expect(droppedBecause(run.plucks, 3)).toEqual(['clipped', 'clipped', 'clipped'])
    for (const no of [1, 2, 4, 5, 6]) expect(droppedBecause(run.plucks, no)).toEqual([null, null, null])
    expect(run.verdict).toBe('none')
  })

  it('drops a string plucked again while it rings as not damped', () => {
    const run = measure('undampedRepluck')
    expect(droppedBecause(run.plucks, 4)).toEqual([null, 'notDamped'])
    expect(run.verdict).toBe('none')
  })

  it.each(['strumSix', 'strumOne'] as const)('drops two strings at once as a strum (%s)', (kind) => {
    const run = measure(kind)
    expect(droppedBecause(run.plucks, 6)).toEqual([null, null, null])
    expect(run.plucks.slice(3).map(({ dropped }) => dropped)).toEqual(['strum', 'strum', 'strum'])
    expect(run.verdict).toBe('none')
  })

  it('fails a dead string that the other channels heard being plucked three times', () => {
    const run = measure('deadString')
    expect(run.strings.map(({ state }) => state)).toEqual(['done', 'silent', 'done', 'done', 'done', 'done'])
    expect(resultOf(run, 2)).toMatchObject({ result: 'outside', why: 'noSignal' })
    expect(run.strings[1]!.level.atMost).toBe(true)
    expect(run.verdict).toBe('fail')
    // one dead string leaves the other five where they are
    const five = [0, 2, 3, 4, 5]
    const mean = five.reduce((sum, i) => sum + proof.expectedLevelDb[i]!, 0) / 5
    for (const i of five)
      expect(Math.abs(run.strings[i]!.balance.value! - (proof.expectedLevelDb[i]! - mean))).toBeLessThan(0.1)
  })
})

import type { BenchEvent, Frame } from '../src/shared/contract/frames.ts'
import type { MeasuredRun } from '../src/shared/contract/measured.ts'
import type { RunSetup } from '../src/shared/contract/runs.ts'
import type { Fault } from '../src/shared/contract/simulation.ts'
import { methods } from '../src/shared/measure/method.ts'
import { changeCount, isFinished, phaseOf, promptOf } from '../src/shared/measure/runState.ts'
import type { RunState } from '../src/shared/measure/runState.ts'
import { makeModelledSource } from './sources/modelledSource.ts'

export interface HeadlessOptions {
  seed: number
  setup: RunSetup
  faults?: readonly Fault[]
  /** standard deviation of a pluck's force, dB */
  scatterDb?: number
  /** the bench's own seed: the same for all instruments that lie on the same bench */
  benchSeed?: number
  /** given up as stopped after so long; a hand that never comes to an end is a fault of the model, s */
  mostS?: number
  /** sees every frame, so that a trace can be stored */
  onFrame?: (frame: Frame, events: readonly BenchEvent[]) => void
}

const MOST_S = 300

/**
 * One whole check without a server and without a clock: a modelled instrument, the automatic hand and the pure
 * measuring of a run. The same options give the same run, to the last bit.
 */
export function runHeadless(options: HeadlessOptions): MeasuredRun {
  const { setup } = options
  const method = methods[setup.method]
  if (!method) throw new RangeError(`method ${setup.method} is not known`)
  const source = makeModelledSource({
    seed: options.benchSeed ?? 1,
    channelKind: setup.channelKind,
    circuit: setup.model.circuit,
    frameMs: setup.frameMs,
    mainsHz: setup.mainsHz,
    capabilities: setup.capabilities,
    hand: true,
    realTime: false,
  })
  source.simulate({
    kind: 'place',
    seed: options.seed,
    faults: [...(options.faults ?? [])],
    scatterDb: options.scatterDb ?? 0.8,
  })
  const state = method.startRun(setup)
  const run = setup.sheet.id
  source.start({
    run,
    serial: 'HEADLESS',
    from: 0,
    window: 0,
    noiseStretchMs: setup.sheet.noiseStretchMs,
    expectedHz: setup.model.tuning.map((pitch) => pitch.pitchesHz),
  })
  const mostFrames = ((options.mostS ?? MOST_S) * 1000) / setup.frameMs
  let seen = -1
  let last = ''
  for (let frameNo = 0; frameNo < mostFrames && !isFinished(state); frameNo++) {
    if (changeCount(state) !== seen) {
      seen = changeCount(state)
      last = tellPrompt(state, last)
    }
    const step = source.next(frameNo)
    if (typeof step === 'string') break
    options.onFrame?.(step.frame, step.events)
    method.takeFrame(state, step.frame, step.events)
  }
  return method.viewRun(state)

  function tellPrompt(of: RunState, before: string): string {
    const { prompt, stringNo } = promptOf(of)
    const phase = phaseOf(of)
    const key = `${phase} ${prompt} ${stringNo}`
    if (key !== before) source.prompt({ run, phase, prompt, stringNo })
    return key
  }
}

/**
 * Frames a second that one thread measures: whole checks, six and one channel. Counted in processor time of this
 * process, so that a busy machine does not make it look slow. `npx tsx tests/perf/measure.ts`
 */
import { changeCount, isFinished, startRun, takeFrame, viewRun } from '../../src/shared/measure/runState.ts'
import type { BenchEvent } from '../../src/shared/contract/frames.ts'
import { buildSetup } from '../helpers/runSetup.ts'
import { buildCheck } from '../helpers/traceBuilder.ts'

const ROUNDS = 15
const CHECKS = 30
function processorMs(): number {
  const { user, system } = process.cpuUsage()
  return (user + system) / 1000
}

const NONE: readonly BenchEvent[] = []

for (const channelKind of ['six', 'one'] as const) {
  for (const frameMs of [10, 5] as const) {
    const setup = buildSetup({ channelKind, frameMs })
    const { frames, events } = buildCheck({ setup })
    const eventsOf: (readonly BenchEvent[])[] = frames.map(() => NONE)
    for (const event of events) eventsOf[event.frame] = [...eventsOf[event.frame]!, event]
    const rates: number[] = []
    let views = 0
    for (let round = 0; round < ROUNDS; round++) {
      let taken = 0
      const start = processorMs()
      for (let check = 0; check < CHECKS; check++) {
        const state = startRun(setup)
        for (let i = 0; i < frames.length && !isFinished(state); i++) {
          takeFrame(state, frames[i]!, eventsOf[i]!)
          taken++
        }
      }
      rates.push((taken / (processorMs() - start)) * 1000)
    }
    const state = startRun(setup)
    frames.forEach((frame, i) => takeFrame(state, frame, eventsOf[i]!))
    const start = processorMs()
    for (; views < 50; views++) viewRun(state)
    const viewMs = (processorMs() - start) / views
    rates.sort((a, b) => a - b)
    const show = (rate: number) => `${(rate / 1e6).toFixed(2)} M`
    console.log(
      `${channelKind}-channel, ${frameMs} ms frames: ${show(rates[0]!)} / ${show(rates[ROUNDS >> 1]!)} / ` +
        `${show(rates[ROUNDS - 1]!)} frames/s (min/median/max of ${ROUNDS}), view ${viewMs.toFixed(1)} ms, ` +
        `${changeCount(state)} changes in a check of ${frames.length} frames`,
    )
  }
}

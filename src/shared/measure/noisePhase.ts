import type { Frame } from '../contract/frames.ts'
import { NOISE_PATIENCE_MS, NOT_YET_QUIET_MS } from './constants.ts'
import { framesOf } from './framesOf.ts'
import { hasWindow, isQuiet, latestSums, restartNoiseStretch, takeNoiseFrame } from './noiseStretch.ts'
import { onsetsAt } from './onsetWatch.ts'
import { elapsedMs } from './phaseTime.ts'
import { keepNoise, type HumEvent, type RunState } from './state.ts'

/** Looks for the muted stretch; true when the run has its noise. */
export function foldNoise(state: RunState, frameNo: number, frame: Frame): boolean {
  const { stretch, onsets, ring } = state
  onsetsAt(onsets, ring, frameNo)
  const quietBefore = stretch.quiet > 0
  if (frame.plugged === false) restartNoiseStretch(stretch)
  else takeNoiseFrame(stretch, frameNo, frame, onsets.above !== 0)
  if (stretch.quiet > 0 !== quietBefore) state.changes++
  if (elapsedMs(state) === framesOf(NOT_YET_QUIET_MS, state.setup.frameMs) * state.setup.frameMs)
    state.changes++
  if (stretch.inBlock !== 0) return false
  if (isQuiet(stretch)) {
    const from = stretch.quietFromFrame
    for (const event of state.humWaiting) keepHumWithin(state, event, from, frameNo + 1)
    const humDone = !state.plan.judgesHum || state.hum.some((event) => event !== null)
    if (humDone || elapsedMs(state) >= NOISE_PATIENCE_MS) {
      state.quietFrames = { from, to: frameNo + 1 }
      keepNoise(state, latestSums(stretch, frameNo))
      return true
    }
  } else if (elapsedMs(state) >= NOISE_PATIENCE_MS && hasWindow(stretch)) {
    takeLatestNoise(state)
    return true
  }
  return false
}

/** Keeps the latest stretch as it is. Not the quietest one: that would hide a crackle. */
export function takeLatestNoise(state: RunState): void {
  const { stretch } = state
  const lastFrame = state.frames - 1 - stretch.inBlock
  const sums = latestSums(stretch, lastFrame)
  state.quietFrames = { from: sums.fromFrame, to: lastFrame + 1 }
  for (const event of state.humWaiting) keepHumWithin(state, event, sums.fromFrame, lastFrame + 1)
  keepNoise(state, sums)
}

/** A hum report, kept when it lies in the quiet stretch, whether that is found yet or not. */
export function takeHum(state: RunState, event: HumEvent): void {
  if (state.phase === 'noise') {
    state.humWaiting.push(event)
    // only what can still lie in a stretch that is quiet up to now
    if (state.humWaiting.length > 64) state.humWaiting.shift()
  } else if (state.noise !== null) keepHumWithin(state, event, state.quietFrames.from, state.quietFrames.to)
}

function keepHumWithin(state: RunState, event: HumEvent, fromFrame: number, toFrame: number): void {
  const tenthMs = state.setup.frameMs * 10
  const end = event.startTenthMs + event.durationTenthMs
  if (event.startTenthMs < fromFrame * tenthMs || end > toFrame * tenthMs) return
  if (state.hum[event.channel] === event) return
  state.hum[event.channel] = event
  state.changes++
}

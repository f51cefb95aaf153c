import type { Frame } from '../contract/frames.ts'
import { JACK_REST_MOST_MS, JACK_REST_MS, SETTLE_MOST_MS, UNPLUGGED_MS } from './constants.ts'
import { restartRest, restartUnplugged, takeRestFrame, takeUnpluggedFrame } from './jackWatch.ts'
import { elapsedMs, settledMs } from './phaseTime.ts'
import { hasSettled, restartSettleWatch, takeSettleFrame } from './settleWatch.ts'
import type { RunState } from './state.ts'

/** Watches the plug out for half a second, then waits for it; true when it is in. */
export function foldUnplugged(state: RunState, frame: Frame): boolean {
  const { jack } = state
  if (jack.unpluggedDone) {
    return frame.plugged === true
  }
  if (frame.plugged !== false) {
    if (jack.unplugged.frames > 0) restartUnplugged(jack)
    return false
  }
  takeUnpluggedFrame(jack, frame)
  if (jack.unplugged.frames * state.setup.frameMs >= UNPLUGGED_MS) {
    jack.unpluggedDone = true
    state.changes++
  }
  return false
}

/** Waits until the floor drifts no more, or long enough; starts again when the plug comes out. True: settled. */
export function foldSettle(state: RunState, frame: Frame): boolean {
  if (frame.plugged === false) {
    if (state.settle.frames > 0) state.changes++
    restartSettleWatch(state.settle)
    return false
  }
  if (state.settle.frames === 0) state.changes++
  takeSettleFrame(state.settle, frame)
  return hasSettled(state.settle) || settledMs(state) >= SETTLE_MOST_MS
}

/** Watches the jack at rest for a second without a disturbance, or for long enough. True: done. */
export function foldJackRest(state: RunState, frame: Frame): boolean {
  const { jack } = state
  const tooLong = elapsedMs(state) >= JACK_REST_MOST_MS
  if (frame.plugged === false && !tooLong) {
    restartRest(jack)
    return false
  }
  takeRestFrame(jack, frame)
  if (jack.rest.frames * state.setup.frameMs < JACK_REST_MS && !tooLong) return false
  jack.restDone = true
  return true
}

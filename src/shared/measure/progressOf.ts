import { JACK_REST_MS, SETTLE_LEAST_MS, UNPLUGGED_MS, WIGGLE_READY_MS } from './constants.ts'
import { elapsedMs, settledMs } from './phaseTime.ts'
import type { RunState } from './state.ts'

/** 0..1 of the present phase where it has a length, else null. */
export function progressOf(state: RunState): number | null {
  const share = (doneMs: number, allMs: number) => Math.min(1, doneMs / allMs)
  switch (state.phase) {
    case 'unplugged':
      return state.jack.unpluggedDone
        ? 1
        : share(state.jack.unplugged.frames * state.setup.frameMs, UNPLUGGED_MS)
    case 'settle':
      return share(settledMs(state), SETTLE_LEAST_MS)
    case 'jackRest':
      return share(state.jack.rest.frames * state.setup.frameMs, JACK_REST_MS)
    case 'noise':
      return state.stretch.quiet / state.stretch.wanted
    case 'strings': {
      let accepted = 0
      let wanted = 0
      for (const tally of state.strings) {
        wanted += tally.wanted
        accepted += tally.state === 'todo' ? tally.accepted.length : tally.wanted
      }
      return share(accepted, wanted)
    }
    case 'wiggleReady':
      return share(elapsedMs(state), WIGGLE_READY_MS)
    case 'wiggle':
      return share(elapsedMs(state), state.setup.sheet.wiggleMs)
    default:
      return null
  }
}

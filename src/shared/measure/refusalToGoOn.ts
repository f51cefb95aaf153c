import { NOT_YET_QUIET_MS, SETTLE_LEAST_MS } from './constants.ts'
import { hasWindow } from './noiseStretch.ts'
import { elapsedMs, settledMs } from './phaseTime.ts'
import type { RunState } from './state.ts'

/** Why 'go on' does not fit now, for the person; null when it does. */
export function refusalToGoOn(state: RunState): string | null {
  switch (state.phase) {
    case 'unplugged':
      return state.plugged === null ? null : 'The bench sees the plug and goes on by itself.'
    case 'settle':
      return settledMs(state) >= SETTLE_LEAST_MS ? null : 'Wait until the preamp has settled, at least 3 s.'
    case 'noise':
      if (elapsedMs(state) >= NOT_YET_QUIET_MS && hasWindow(state.stretch)) return null
      return 'Keep the strings muted; the quiet stretch is found by itself.'
    case 'jackRest':
      return 'Hold still for a second; the run goes on by itself.'
    case 'wiggle':
      return 'Keep wiggling until the time is over.'
    case 'wiggleReady':
      return state.plugged === false ? 'Plug in first; then the wiggle can begin.' : null
    case 'strings':
    case 'entry':
      return null
    case 'done':
    case 'stopped':
      return 'The run has ended.'
  }
}

import type { Frame } from '../contract/frames.ts'
import {
  WIGGLE_GRACE_MS,
  WIGGLE_PLUG_OUT_MOST_MS,
  WIGGLE_READY_MS,
  WIGGLE_TIP_LEAST_SHARE,
} from './constants.ts'
import { framesOf } from './framesOf.ts'
import { cutWiggle, takeWiggleFrame, watchWiggle } from './jackWatch.ts'
import { elapsedMs } from './phaseTime.ts'
import type { RunState } from './state.ts'

/** Waits for hands to be ready; with the plug out for the plug, then anew. True: the wiggle begins by itself. */
export function foldWiggleReady(state: RunState): boolean {
  if (state.plugged === false) state.phaseFromFrame = state.frames
  return elapsedMs(state) >= WIGGLE_READY_MS
}

/** Watches the wiggle from the next frame on, for as long as the sheet says. */
export function startWiggle(state: RunState): void {
  const { frameMs, sheet } = state.setup
  const tenthMs = frameMs * 10
  state.phaseFromFrame = state.frames
  state.progressTenths = 0
  state.changes++
  const toFrame = state.frames + framesOf(sheet.wiggleMs, frameMs)
  watchWiggle(state.jack, state.frames * tenthMs, toFrame * tenthMs)
}

/** Watches the tip while the plug is wiggled, then waits for late reports; starts again after a plug that came out. True: done. */
export function foldWiggle(state: RunState, frame: Frame): boolean {
  const { jack, setup } = state
  const lastedMs = elapsedMs(state)
  const inside = lastedMs <= setup.sheet.wiggleMs
  if (jack.wiggle.waitsForPlug || (inside && state.plugged === false)) return waitForPlug(state)
  if (inside) takeWiggleFrame(jack, frame)
  if (lastedMs < setup.sheet.wiggleMs + WIGGLE_GRACE_MS) return false
  jack.wiggleDone = true
  return true
}

/** True: the plug stayed out, or kept coming out, for too long. */
function waitForPlug(state: RunState): boolean {
  const { jack, setup } = state
  const { wiggle } = jack
  if (state.plugged !== false) {
    startWiggle(state)
    return false
  }
  if (!wiggle.waitsForPlug) {
    wiggle.waitsForPlug = true
    // the plug may still have been in when this frame began
    cutWiggle(wiggle, state.frames * setup.frameMs * 10)
    state.changes++
  }
  state.phaseFromFrame = state.frames
  wiggle.firstOutFrame ??= state.frames
  if ((state.frames - wiggle.firstOutFrame) * setup.frameMs < WIGGLE_PLUG_OUT_MOST_MS) return false
  wiggle.endedUnplugged = true
  jack.wiggleDone = true
  return true
}

/** A bench that says it measures the tip did so in nearly the whole wiggle; of any other bench it is not asked. */
export function isTipWatched({ setup, jack }: RunState): boolean {
  if (!setup.capabilities.includes('tipContinuity')) return true
  return jack.wiggle.tipFrames >= WIGGLE_TIP_LEAST_SHARE * framesOf(setup.sheet.wiggleMs, setup.frameMs)
}

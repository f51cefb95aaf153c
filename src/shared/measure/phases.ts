import type { BenchEvent, Frame } from '../contract/frames.ts'
import type { RunPhase } from '../contract/measured.ts'
import {
  CENSOR_DB,
  JACK_REST_MOST_MS,
  JACK_REST_MS,
  NOISE_PATIENCE_MS,
  NOTHING_CAME_MS,
  NOT_YET_QUIET_MS,
  SAME_PLUCK_MS,
  SETTLE_LEAST_MS,
  SETTLE_MOST_MS,
  UNPLUGGED_MS,
  WIGGLE_GRACE_MS,
  WIGGLE_READY_MS,
  WINDOW_TO_MS,
} from './constants.ts'
import { evaluateRun } from './evaluateRun.ts'
import { framesOf } from './framesOf.ts'
import {
  restartRest,
  restartUnplugged,
  restartWiggle,
  takeContact,
  takeDisturbance,
  takeInsulation,
  takeRestFrame,
  takeUnpluggedFrame,
  takeWiggleFrame,
} from './jackWatch.ts'
import { decideRun, stringsInGuardBand } from './judgeRun.ts'
import { forgetLevels, meanPowerIn, pushFrame } from './levelRing.ts'
import { dbOfPower } from './meanPowerDb.ts'
import { hasWindow, isQuiet, latestSums, restartNoiseStretch, takeNoiseFrame } from './noiseStretch.ts'
import { disarmOnsets, onsetsAt } from './onsetWatch.ts'
import { forgetPitches, logPitch } from './pitchLog.ts'
import { endPlucks, interruptPluck, takeNoSignal, watchPlucks } from './plucks.ts'
import { rulesToEnter } from './runPlan.ts'
import { hasSettled, restartSettleWatch, takeSettleFrame } from './settleWatch.ts'
import { askedString, channelOf, isFinished, keepNoise, type HumEvent, type RunState } from './state.ts'
import { askForOneMore, type StringTally } from './stringTally.ts'
import { verdictOf } from './verdictOf.ts'

/** Folds one frame, its events first, except the end of a recording, which comes after its last frame. */
export function foldFrame(state: RunState, frame: Frame, events: readonly BenchEvent[]): void {
  if (isFinished(state)) return
  let ended = false
  for (const event of events) {
    if (event.kind === 'endOfSource') ended = true
    else foldEvent(state, event)
  }
  if (isFinished(state)) return
  const frameNo = state.frames
  if (frame.plugged !== null) state.plugged = frame.plugged
  pushFrame(state.ring, frameNo, frame)
  state.frames = frameNo + 1
  foldIntoPhase(state, frameNo, frame)
  noteProgress(state)
  if (ended) endRun(state)
}

function foldIntoPhase(state: RunState, frameNo: number, frame: Frame): void {
  switch (state.phase) {
    case 'unplugged':
      return foldUnplugged(state, frame)
    case 'settle':
      return foldSettle(state, frame)
    case 'jackRest':
      return foldJackRest(state, frame)
    case 'noise':
      return foldNoise(state, frameNo, frame)
    case 'strings':
      watchPlucks(state, frameNo)
      if (askedString(state) === null) finishStrings(state)
      return
    case 'wiggleReady':
      if (elapsedMs(state) >= WIGGLE_READY_MS) beginWiggle(state, 'itself')
      return
    case 'wiggle':
      return foldWiggle(state, frame)
    case 'entry':
    case 'done':
    case 'stopped':
  }
}

/** ms since the present phase began. */
export function elapsedMs(state: RunState): number {
  return (state.frames - state.phaseFromFrame) * state.setup.frameMs
}

function enterPhase(state: RunState, phase: RunPhase): void {
  state.phase = phase
  state.phaseFromFrame = state.frames
  state.progressTenths = 0
  state.changes++
  if (phase === 'settle') restartSettleWatch(state.settle)
  if (phase === 'done') state.verdict = judgeVerdict(state)
}

function judgeVerdict(state: RunState): 'pass' | 'fail' | 'none' {
  const results = decideRun(state, evaluateRun(state))
  return verdictOf(results, { verified: state.setup.verified, stopped: false })
}

/** Goes on to the next phase of the plan that has something left to do. */
function advance(state: RunState): void {
  const { phases } = state.plan
  let next = phases.indexOf(state.phase) + 1
  while (phases[next] !== undefined && isOver(state, phases[next]!)) next++
  enterPhase(state, phases[next] ?? 'done')
}

function isOver(state: RunState, phase: RunPhase): boolean {
  if (phase === 'wiggleReady' || phase === 'wiggle') return state.jack.wiggleDone
  return phase === 'entry' && missingEntries(state).length === 0
}

/** Required rules that a person must enter and has not. */
export function missingEntries(state: RunState): string[] {
  return rulesToEnter(state.setup)
    .map((r) => r.rule)
    .filter((rule) => !state.entered.some((entry) => entry.rule === rule))
}

function endRun(state: RunState): void {
  if (isFinished(state)) return
  if (state.phase === 'strings') endPlucks(state)
  enterPhase(state, 'done')
}

/** Stops the run: no verdict. */
export function stopRun(state: RunState): void {
  interruptPluck(state, 'interrupted')
  enterPhase(state, 'stopped')
  state.verdict = 'none'
}

function foldEvent(state: RunState, event: Exclude<BenchEvent, { kind: 'endOfSource' }>): void {
  switch (event.kind) {
    case 'pitch':
      return logPitch(state.pitches, event)
    case 'disturbance':
      if (state.phase === 'jackRest') restartRest(state.jack)
      return takeDisturbance(state.jack, event)
    case 'contact':
      // a contact that is being moved is not measured
      if (!['unplugged', 'settle', 'wiggleReady', 'wiggle'].includes(state.phase))
        takeContact(state.jack, event)
      state.changes++
      return
    case 'insulation':
      takeInsulation(state.jack, event)
      state.changes++
      return
    case 'hum':
      return takeHum(state, event)
    case 'pedal':
      if (refusalToGoOn(state) === null) goOn(state, 'pedal')
      return
    case 'discontinuity':
      return breakOff(state)
  }
}

/** Frames before and after are not continuous: histories, a pluck and a stretch under way start again. */
function breakOff(state: RunState): void {
  forgetLevels(state.ring)
  forgetPitches(state.pitches)
  disarmOnsets(state.onsets)
  interruptPluck(state, 'interrupted')
  switch (state.phase) {
    case 'unplugged':
      return restartUnplugged(state.jack)
    case 'settle':
      return restartSettleWatch(state.settle)
    case 'jackRest':
      return restartRest(state.jack)
    case 'noise':
      state.humWaiting = []
      return restartNoiseStretch(state.stretch)
    case 'wiggle':
      state.jack.wiggleStartedBy ??= 'itself'
      return beginWiggle(state, state.jack.wiggleStartedBy)
    default:
  }
}

function foldUnplugged(state: RunState, frame: Frame): void {
  const { jack } = state
  if (jack.unpluggedDone) {
    if (frame.plugged === true) advance(state)
    return
  }
  if (frame.plugged !== false) {
    if (jack.unplugged.frames > 0) restartUnplugged(jack)
    return
  }
  takeUnpluggedFrame(jack, frame)
  if (jack.unplugged.frames * state.setup.frameMs >= UNPLUGGED_MS) {
    jack.unpluggedDone = true
    state.changes++
  }
}

function foldSettle(state: RunState, frame: Frame): void {
  if (frame.plugged === false) {
    if (state.settle.frames > 0) state.changes++
    restartSettleWatch(state.settle)
    return
  }
  if (state.settle.frames === 0) state.changes++
  takeSettleFrame(state.settle, frame)
  if (hasSettled(state.settle) || settledMs(state) >= SETTLE_MOST_MS) advance(state)
}

/** ms since the plug was seen in, while the run settles. */
export function settledMs(state: RunState): number {
  return state.settle.frames * state.setup.frameMs
}

function foldJackRest(state: RunState, frame: Frame): void {
  const { jack } = state
  const tooLong = elapsedMs(state) >= JACK_REST_MOST_MS
  if (frame.plugged === false && !tooLong) return restartRest(jack)
  takeRestFrame(jack, frame)
  if (jack.rest.frames * state.setup.frameMs < JACK_REST_MS && !tooLong) return
  jack.restDone = true
  advance(state)
}

function foldNoise(state: RunState, frameNo: number, frame: Frame): void {
  const { stretch, onsets, ring } = state
  onsetsAt(onsets, ring, frameNo)
  const quietBefore = stretch.quiet > 0
  if (frame.plugged === false) restartNoiseStretch(stretch)
  else takeNoiseFrame(stretch, frameNo, frame, onsets.above !== 0)
  if (stretch.quiet > 0 !== quietBefore) state.changes++
  if (elapsedMs(state) === framesOf(NOT_YET_QUIET_MS, state.setup.frameMs) * state.setup.frameMs)
    state.changes++
  if (stretch.inBlock !== 0) return
  if (isQuiet(stretch)) {
    const from = stretch.quietFromFrame
    for (const event of state.humWaiting) keepHumWithin(state, event, from, frameNo + 1)
    const humDone = !state.plan.judgesHum || state.hum.some((event) => event !== null)
    if (humDone || elapsedMs(state) >= NOISE_PATIENCE_MS) {
      state.quietFrames = { from, to: frameNo + 1 }
      keepNoise(state, latestSums(stretch, frameNo))
      advance(state)
    }
  } else if (elapsedMs(state) >= NOISE_PATIENCE_MS && hasWindow(stretch)) takeLatest(state)
}

/** Goes on with the latest stretch as it is. Not with the quietest one: that would hide a crackle. */
function takeLatest(state: RunState): void {
  const { stretch } = state
  const lastFrame = state.frames - 1 - stretch.inBlock
  const sums = latestSums(stretch, lastFrame)
  state.quietFrames = { from: sums.fromFrame, to: lastFrame + 1 }
  for (const event of state.humWaiting) keepHumWithin(state, event, sums.fromFrame, lastFrame + 1)
  keepNoise(state, sums)
  advance(state)
}

function takeHum(state: RunState, event: HumEvent): void {
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

function beginWiggle(state: RunState, by: 'person' | 'pedal' | 'itself'): void {
  const tenthMs = state.setup.frameMs * 10
  state.jack.wiggleStartedBy = by
  if (state.phase !== 'wiggle') enterPhase(state, 'wiggle')
  else {
    state.phaseFromFrame = state.frames
    state.progressTenths = 0
    state.changes++
  }
  const frames = framesOf(state.setup.sheet.wiggleMs, state.setup.frameMs)
  restartWiggle(state.jack, state.frames * tenthMs, (state.frames + frames) * tenthMs)
}

function foldWiggle(state: RunState, frame: Frame): void {
  const lastedMs = elapsedMs(state)
  if (lastedMs <= state.setup.sheet.wiggleMs) takeWiggleFrame(state.jack, frame)
  if (lastedMs < state.setup.sheet.wiggleMs + WIGGLE_GRACE_MS) return
  state.jack.wiggleDone = true
  advance(state)
}

/** All strings have what they need: asks for more where the guard band says so, else goes on. */
function finishStrings(state: RunState): void {
  let more = false
  if (state.setup.sheet.guard.on) {
    for (const stringNo of stringsInGuardBand(state, evaluateRun(state))) {
      if (askForOneMore(state.strings[stringNo - 1]!, state.plan)) more = true
    }
    if (more) state.levelChanges++
  }
  state.changes++
  if (!more) advance(state)
}

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
    case 'strings':
    case 'wiggleReady':
    case 'entry':
      return null
    case 'done':
    case 'stopped':
      return 'The run has ended.'
  }
}

/** 'Go on', as the present phase means it. */
export function goOn(state: RunState, by: 'person' | 'pedal'): void {
  switch (state.phase) {
    case 'unplugged':
    case 'settle':
    case 'entry':
      return advance(state)
    case 'noise':
      return takeLatest(state)
    case 'strings':
      return sayNoSignal(state, askedString(state)!)
    case 'wiggleReady':
      return beginWiggle(state, by)
    default:
  }
}

/**
 * A string was plucked and nothing came. Not believed, and of no effect, while a pluck is being analysed or while the
 * string's channel stood at floor + 6 dB or more over the last moment: then something did come.
 */
export function sayNoSignal(state: RunState, tally: StringTally): void {
  if (state.pluck !== null) return
  const last = state.plucks.at(-1)
  const { frameMs } = state.setup
  if (last) {
    const sinceMs = (state.frames - last.onsetFrame) * frameMs
    if (sinceMs < WINDOW_TO_MS) return
    // the bench told of this very pluck already: one pluck must not count twice
    const told = last.stringNo === tally.stringNo && last.dropped === 'belowFloor' && last.toldBy !== 'person'
    if (told && sinceMs < SAME_PLUCK_MS) return
  }
  const channel = channelOf(state, tally.stringNo)
  const from = Math.max(0, state.frames - NOTHING_CAME_MS / frameMs)
  const levelDb =
    dbOfPower(meanPowerIn(state.ring, channel, from, state.frames, 'flat')) +
    state.plan.calibrationDb[channel]!
  if (levelDb >= state.floorDb[channel]! + CENSOR_DB) return
  takeNoSignal(state, tally)
  if (askedString(state) === null) finishStrings(state)
}

/** Takes the run back to its strings, for a repeat. */
export function backToStrings(state: RunState): void {
  if (state.phase === 'strings') return
  enterPhase(state, 'strings')
  disarmOnsets(state.onsets)
}

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

function noteProgress(state: RunState): void {
  // in the strings phase progress moves with plucks only, and those count by themselves
  if (state.phase === 'strings') return
  const tenths = Math.floor((progressOf(state) ?? 0) * 10)
  if (tenths === state.progressTenths) return
  state.progressTenths = tenths
  state.changes++
}

import type { BenchEvent, Frame } from '../contract/frames.ts'
import type { RunPhase } from '../contract/measured.ts'
import { CENSOR_DB, NOTHING_CAME_MS, SAME_PLUCK_MS, SETTLE_LEAST_MS, WINDOW_TO_MS } from './constants.ts'
import { evaluateRun } from './evaluateRun.ts'
import { framesOf } from './framesOf.ts'
import { foldJackRest, foldSettle, foldUnplugged } from './jackPhases.ts'
import { restartRest, restartUnplugged, takeContact, takeDisturbance, takeInsulation } from './jackWatch.ts'
import { decideRun, stringsInGuardBand } from './judgeRun.ts'
import { forgetLevels, meanPowerIn, pushFrame } from './levelRing.ts'
import { dbOfPower } from './meanPowerDb.ts'
import { foldNoise, takeHum, takeLatestNoise } from './noisePhase.ts'
import { restartNoiseStretch } from './noiseStretch.ts'
import { disarmOnsets, onsetsAt } from './onsetWatch.ts'
import { forgetPitches, logPitch } from './pitchLog.ts'
import { endPlucks, interruptPluck, takeNoSignal, watchPlucks } from './plucks.ts'
import { progressOf } from './progressOf.ts'
import { refusalToGoOn } from './refusalToGoOn.ts'
import { rulesToEnter } from './runPlan.ts'
import { restartSettleWatch } from './settleWatch.ts'
import { askedString, channelOf, isFinished, type RunState } from './state.ts'
import { askForOneMore, type StringTally } from './stringTally.ts'
import { verdictOf } from './verdictOf.ts'
import { foldWiggle, foldWiggleReady, startWiggle } from './wigglePhase.ts'

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
  notePlug(state, frame)
  pushFrame(state.ring, frameNo, frame)
  state.frames = frameNo + 1
  foldIntoPhase(state, frameNo, frame)
  noteProgress(state)
  if (ended) endRun(state)
}

/** A plug that was out thumps when it comes back, and the preamp settles: none of that is a pluck. */
function settlesAnew(state: RunState, frameNo: number): boolean {
  if (state.plugged === false) {
    interruptPluck(state, 'interrupted')
    state.plucksFromFrame = frameNo + framesOf(SETTLE_LEAST_MS, state.setup.frameMs)
  }
  if (frameNo >= state.plucksFromFrame) return false
  onsetsAt(state.onsets, state.ring, frameNo)
  return true
}

function notePlug(state: RunState, { plugged }: Frame): void {
  if (plugged === null || plugged === state.plugged) return
  state.plugged = plugged
  state.changes++
}

function foldIntoPhase(state: RunState, frameNo: number, frame: Frame): void {
  switch (state.phase) {
    case 'unplugged':
      if (foldUnplugged(state, frame)) advance(state)
      return
    case 'settle':
      if (foldSettle(state, frame)) advance(state)
      return
    case 'jackRest':
      if (foldJackRest(state, frame)) advance(state)
      return
    case 'noise':
      if (foldNoise(state, frameNo, frame)) advance(state)
      return
    case 'strings':
      if (settlesAnew(state, frameNo)) return
      watchPlucks(state, frameNo)
      if (askedString(state) === null) finishStrings(state)
      return
    case 'wiggleReady':
      if (foldWiggleReady(state)) beginWiggle(state, 'itself')
      return
    case 'wiggle':
      if (foldWiggle(state, frame)) advance(state)
      return
    case 'entry':
    case 'done':
    case 'stopped':
  }
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
      // one that waits for the plug starts again when it is back
      if (!state.jack.wiggle.waitsForPlug) startWiggle(state)
      return
    default:
  }
}

function beginWiggle(state: RunState, by: 'person' | 'pedal' | 'itself'): void {
  state.jack.wiggleStartedBy = by
  enterPhase(state, 'wiggle')
  startWiggle(state)
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

/** 'Go on', as the present phase means it. */
export function goOn(state: RunState, by: 'person' | 'pedal'): void {
  switch (state.phase) {
    case 'unplugged':
    case 'settle':
    case 'entry':
      return advance(state)
    case 'noise':
      takeLatestNoise(state)
      return advance(state)
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

function noteProgress(state: RunState): void {
  // in the strings phase progress moves with plucks only, and those count by themselves
  if (state.phase === 'strings') return
  const tenths = Math.floor((progressOf(state) ?? 0) * 10)
  if (tenths === state.progressTenths) return
  state.progressTenths = tenths
  state.changes++
}

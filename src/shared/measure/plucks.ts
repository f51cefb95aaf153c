import type { PitchEvent } from '../contract/frames.ts'
import type { DropReason, Pluck } from '../contract/measured.ts'
import {
  CENSOR_DB,
  CONFIRM_DB,
  DAMPED_BELOW_DB,
  DECIDE_AFTER_MS,
  LEAD_DB,
  PITCH_CHANNEL_WITHIN_DB,
  RINGING_DB,
  RISE_FROM_MS,
  SECOND_ONSET_FROM_MS,
  SECOND_ONSET_WITHIN_DB,
  WINDOW_FROM_MS,
  WINDOW_TO_MS,
} from './constants.ts'
import { framesOf } from './framesOf.ts'
import { clippedIn, levelAt, loudestMdb, meanPowerIn, slopeDbPerFrame } from './levelRing.ts'
import { dbOfPower } from './meanPowerDb.ts'
import { noiseCorrectionDb } from './noiseCorrectionDb.ts'
import { onsetsAt, ownFloorMdb, repluckedAt, risesAt } from './onsetWatch.ts'
import { pitchesOver, stringsOfPitch } from './pitchLog.ts'
import { askedString, channelOf, type PluckUnderWay, type RunState } from './state.ts'
import { refreshString, type MeasuredPluck, type StringTally } from './stringTally.ts'

/** Looks at the newest frame for an onset, a second onset, and the end of a pluck under way. */
export function watchPlucks(state: RunState, frameNo: number): void {
  const { setup, onsets, ring } = state
  const onset = onsetsAt(onsets, ring, frameNo) !== 0
  if (state.pluck !== null) {
    const elapsedMs = (frameNo - state.pluck.onsetFrame) * setup.frameMs
    if (elapsedMs < WINDOW_TO_MS) {
      if (elapsedMs >= SECOND_ONSET_FROM_MS && risesWithinWindow(state, frameNo)) {
        state.pluck.secondOnsetFrame = frameNo
      }
      return
    }
  }
  // a second onset near the end of the window still rises after it: it is dropped with its pluck, not counted again
  const sinceSecondMs = (frameNo - (state.pluck?.secondOnsetFrame ?? -Infinity)) * setup.frameMs
  const onRinging =
    !onset && sinceSecondMs >= RISE_FROM_MS && repluckedAt(onsets, ring, frameNo, state.mutedFloorMdb) !== 0
  if (state.pluck !== null) {
    const elapsedMs = (frameNo + 1 - state.pluck.onsetFrame) * setup.frameMs
    if (!onset && !onRinging && elapsedMs < DECIDE_AFTER_MS) return
    decidePluck(state, state.pluck)
  }
  if (onset) beginPluck(state, frameNo, false)
  // a rise is told by two frames; the excitation began with the first
  else if (onRinging) beginPluck(state, frameNo - 1, true)
}

function beginPluck(state: RunState, onsetFrame: number, onRinging: boolean): void {
  const { ring, onsets } = state
  state.pluck = {
    onsetFrame,
    onRinging,
    secondOnsetFrame: null,
    ownFloorMdb: Array.from({ length: ring.channels }, (_, channel) =>
      ownFloorMdb(onsets, ring, channel, onsetFrame),
    ),
  }
}

/** Something was excited again while a pluck's window is open, loud enough to change its level. */
function risesWithinWindow(state: RunState, frameNo: number): boolean {
  const { ring, onsets } = state
  let loudest = -Infinity
  for (let channel = 0; channel < ring.channels; channel++) {
    loudest = Math.max(loudest, loudestMdb(ring, channel, frameNo, frameNo + 1))
  }
  const least = loudest - SECOND_ONSET_WITHIN_DB * 1000
  for (let channel = 0; channel < ring.channels; channel++) {
    if (levelAt(ring, channel, frameNo) >= least && risesAt(onsets, ring, channel, frameNo)) return true
  }
  return false
}

/** The bench restarted or the recording ended within the window. */
export function interruptPluck(state: RunState, reason: 'interrupted' | 'shortWindow'): void {
  if (state.pluck === null) return
  keepPluck(state, { ...blank(state, state.pluck), dropped: reason })
  state.pluck = null
}

/** Decides the pluck under way if its window is complete, else drops it: nothing more comes. */
export function endPlucks(state: RunState): void {
  if (state.pluck === null) return
  if ((state.frames - state.pluck.onsetFrame) * state.setup.frameMs >= WINDOW_TO_MS) {
    decidePluck(state, state.pluck)
  } else interruptPluck(state, 'shortWindow')
}

function blank(state: RunState, pluck: Pick<PluckUnderWay, 'onsetFrame'>): MeasuredPluck {
  return {
    no: state.plucks.length + 1,
    onsetFrame: pluck.onsetFrame,
    stringNo: null,
    toldBy: 'prompt',
    milliHz: null,
    levelDb: null,
    rawDb: null,
    atMost: false,
    separationDb: null,
    dropped: null,
    rawADb: null,
    decayDbPerS: null,
  }
}

function keepPluck(state: RunState, pluck: MeasuredPluck): void {
  state.plucks.push(pluck)
  state.changes++
}

/** Levels of every channel over the pluck's window, dBV; -Infinity for silence, NaN when a frame is missing. */
function windowLevels(state: RunState, from: number, to: number, weighting: 'flat' | 'a'): number[] {
  return state.plan.calibrationDb.map(
    (offset, channel) => dbOfPower(meanPowerIn(state.ring, channel, from, to, weighting)) + offset,
  )
}

function decidePluck(state: RunState, underWay: PluckUnderWay): void {
  state.pluck = null
  const { setup } = state
  const from = underWay.onsetFrame + framesOf(WINDOW_FROM_MS, setup.frameMs)
  const to = underWay.onsetFrame + Math.floor(WINDOW_TO_MS / setup.frameMs)
  const levels = windowLevels(state, from, to, 'flat')
  const told = tellString(state, underWay, levels)
  const pluck: MeasuredPluck = { ...blank(state, underWay), ...told.pluck }
  if (told.dropped === 'strum') {
    keepPluck(state, { ...pluck, dropped: 'strum' })
    return
  }
  const stringNo = pluck.stringNo!
  const channel = channelOf(state, stringNo)
  const rawDb = levels[channel]!
  const floorDb = state.floorDb[channel]!
  const heard = noiseCorrectionDb(rawDb - floorDb)
  if (Number.isFinite(rawDb)) pluck.rawDb = rawDb
  if (heard !== null) {
    pluck.levelDb = rawDb - heard
    pluck.separationDb = separationOf(pluck.levelDb, channel, levels)
    const slope = slopeDbPerFrame(state.ring, channel, from, to)
    pluck.decayDbPerS = Number.isFinite(slope) ? (-slope * 1000) / setup.frameMs : null
    const rawADb = windowLevels(state, from, to, 'a')[channel]!
    pluck.rawADb = Number.isFinite(rawADb) ? rawADb : null
  } else if (!Number.isNaN(rawDb) && Number.isFinite(floorDb)) {
    pluck.levelDb = floorDb + CENSOR_DB
    pluck.atMost = true
  }
  const tally = state.strings[stringNo - 1]!
  const stillRang = underWay.onRinging || rangBefore(state, underWay, channel, rawDb)
  pluck.dropped =
    tally.state !== 'todo'
      ? 'stringDone'
      : firstReason([
          ['clipped', clippedIn(state.ring, underWay.onsetFrame, to) > 0],
          ['secondOnset', underWay.secondOnsetFrame !== null],
          ['wrongPitch', told.dropped === 'wrongPitch'],
          ['notDamped', stillRang],
          ['shortWindow', Number.isNaN(rawDb)],
          ['belowFloor', heard === null],
        ])
  if (pluck.dropped === 'belowFloor' && !isConfirmed(state, told, levels)) pluck.stringNo = null
  keepPluck(state, pluck)
  if (pluck.stringNo !== null && pluck.dropped !== 'stringDone') countTry(state, tally, pluck)
}

function firstReason(reasons: [DropReason, boolean][]): DropReason | null {
  return reasons.find(([, applies]) => applies)?.[0] ?? null
}

function countTry(state: RunState, tally: StringTally, pluck: MeasuredPluck): void {
  tally.tries++
  state.levelChanges++
  if (pluck.dropped === null) tally.accepted.push(pluck)
  if (pluck.dropped === 'belowFloor') tally.noSignalCount++
  refreshString(tally, state.plan, state.setup.sheet)
}

/**
 * A person says that a string was plucked and nothing came: counts as a try of that string, kept as a pluck told by
 * the person.
 */
export function takeNoSignal(state: RunState, tally: StringTally): void {
  const channel = channelOf(state, tally.stringNo)
  const boundDb = state.floorDb[channel]! + CENSOR_DB
  const pluck: MeasuredPluck = {
    ...blank(state, { onsetFrame: state.frames }),
    stringNo: tally.stringNo,
    toldBy: 'person',
    levelDb: Number.isFinite(boundDb) ? boundDb : null,
    atMost: Number.isFinite(boundDb),
    dropped: 'belowFloor',
  }
  keepPluck(state, pluck)
  countTry(state, tally, pluck)
}

interface Told {
  pluck: Pick<Pluck, 'stringNo' | 'toldBy' | 'milliHz'>
  dropped: 'strum' | 'wrongPitch' | null
}

/**
 * Which string it was: that of the pitch reported over the window; without a pitch the element that leads by 6 dB; if
 * none leads, the string asked for. Two pitches that no one string has: a strum.
 */
function tellString(state: RunState, underWay: PluckUnderWay, levels: readonly number[]): Told {
  const asked = askedString(state)?.stringNo ?? 1
  const lead = leadingString(state, levels)
  const otherwise = lead ?? asked
  const toldBy = lead === null ? ('prompt' as const) : ('lead' as const)
  const heard = pitchesOf(state, underWay, levels)
  const { tuning } = state.setup.model
  const known = heard.filter((event) => stringsOfPitch(event.milliHz, tuning) !== 0)
  if (known.length === 0) {
    const surest = surestOf(heard)
    return {
      pluck: { stringNo: otherwise, toldBy, milliHz: surest?.milliHz ?? null },
      dropped: surest === null ? null : 'wrongPitch',
    }
  }
  const milliHz = surestOf(known)!.milliHz
  const strings = known.reduce((bits, event) => bits & stringsOfPitch(event.milliHz, tuning), 0b111111)
  if (strings === 0) return { pluck: { stringNo: null, toldBy: 'pitch', milliHz }, dropped: 'strum' }
  // a tuning in which two courses share a pitch leaves a choice: the leading one, the one asked for, the lowest
  const stringNo =
    [lead, asked, 6, 5, 4, 3, 2, 1].find((no) => no !== null && (strings & (1 << (no - 1))) !== 0) ?? asked
  return { pluck: { stringNo, toldBy: 'pitch', milliHz }, dropped: null }
}

function pitchesOf(state: RunState, underWay: PluckUnderWay, levels: readonly number[]): PitchEvent[] {
  const fromTenthMs = underWay.onsetFrame * state.setup.frameMs * 10
  const loudest = Math.max(...levels.filter((level) => !Number.isNaN(level)))
  return pitchesOver(state.pitches, fromTenthMs, fromTenthMs + WINDOW_TO_MS * 10).filter(
    ({ channel }) =>
      channel === 0 || levels.length === 1 || levels[channel - 1]! >= loudest - PITCH_CHANNEL_WITHIN_DB,
  )
}

function surestOf(events: readonly PitchEvent[]): PitchEvent | null {
  let surest: PitchEvent | null = null
  for (const event of events) {
    if (surest === null || event.confidencePercent > surest.confidencePercent) surest = event
  }
  return surest
}

/** The string whose element is at least 6 dB above every other; null when none is, or there is one channel. */
function leadingString(state: RunState, levels: readonly number[]): number | null {
  if (state.plan.channels === 1) return null
  let first = -1
  let second = -Infinity
  levels.forEach((level, i) => {
    if (Number.isNaN(level)) return
    if (first < 0 || level > levels[first]!) {
      if (first >= 0) second = levels[first]!
      first = i
    } else second = Math.max(second, level)
  })
  return first >= 0 && levels[first]! - second >= LEAD_DB ? first + 1 : null
}

/** The string's own channel stood above the muted floor before the onset and the pluck is not 20 dB above that. */
function rangBefore(state: RunState, underWay: PluckUnderWay, channel: number, rawDb: number): boolean {
  const beforeMdb = underWay.ownFloorMdb[channel]!
  if (!(beforeMdb > state.mutedFloorMdb[channel]! + RINGING_DB * 1000)) return false
  return !(rawDb - (beforeMdb / 1000 + state.plan.calibrationDb[channel]!) >= DAMPED_BELOW_DB)
}

/** A pluck that its own element did not hear did happen: its pitch was reported, or another element sounds. */
function isConfirmed(state: RunState, told: Told, levels: readonly number[]): boolean {
  if (told.pluck.toldBy === 'pitch') return true
  return levels.some((level, channel) => level >= state.floorDb[channel]! + CONFIRM_DB)
}

/** Level of the plucked element minus the loudest other; null with one channel. */
function separationOf(levelDb: number, channel: number, levels: readonly number[]): number | null {
  let loudest = -Infinity
  levels.forEach((level, other) => {
    if (other !== channel && level > loudest) loudest = level
  })
  const separation = levelDb - loudest
  return Number.isFinite(separation) ? separation : null
}

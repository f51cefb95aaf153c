import type { BenchEvent, Frame } from '../contract/frames.ts'

/** A yes/no that was watched over frames: how many said yes and no; 'not measured' is neither. */
export interface Tally {
  yes: number
  no: number
}

/** A value that was averaged over frames. */
export interface Average {
  sum: number
  frames: number
}

export type Pole = 'tip' | 'ring' | 'sleeve'

/** What was seen in the wiggle. A wiggle that starts again keeps what was seen before: it happened. */
export interface WiggleWatch {
  tipClosed: Tally
  /** frames since it last started in which the tip was measured */
  tipFrames: number
  count: number
  longestTenthMs: number
  /** stretches in which the plug was in and wiggled, [from, to): disturbances that start inside count */
  stretches: { fromTenthMs: number; toTenthMs: number }[]
  /** the plug came out: the wiggle starts again when it is back */
  waitsForPlug: boolean
  /** frame in which the plug was first seen out */
  firstOutFrame: number | null
  /** the plug stayed out for too long: what was seen is no reading of a wiggle */
  endedUnplugged: boolean
}

/** What was seen of the jack, the supply and the contacts. */
export interface JackWatch {
  unplugged: { frames: number; ringClosed: Tally; tipClosed: Tally; currentUa: Average }
  rest: {
    frames: number
    /** frames in which the bench said that the plug is out */
    plugOut: number
    ringClosed: Tally
    tipClosed: Tally
    currentUa: Average
    batteryMv: Average
  }
  wiggle: WiggleWatch
  restDone: boolean
  unpluggedDone: boolean
  wiggleDone: boolean
  wiggleStartedBy: 'person' | 'pedal' | 'itself' | null
  /** worst of what the bench reported, microohm */
  contact: Record<Pole, number | null>
  /** worst, kiloohm */
  insulationKiloOhm: number | null
}

export function createJackWatch(): JackWatch {
  return {
    unplugged: { frames: 0, ringClosed: tally(), tipClosed: tally(), currentUa: average() },
    rest: emptyRest(),
    wiggle: {
      tipClosed: tally(),
      tipFrames: 0,
      count: 0,
      longestTenthMs: 0,
      stretches: [],
      waitsForPlug: false,
      firstOutFrame: null,
      endedUnplugged: false,
    },
    restDone: false,
    unpluggedDone: false,
    wiggleDone: false,
    wiggleStartedBy: null,
    contact: { tip: null, ring: null, sleeve: null },
    insulationKiloOhm: null,
  }
}

function emptyRest(): JackWatch['rest'] {
  return {
    frames: 0,
    plugOut: 0,
    ringClosed: tally(),
    tipClosed: tally(),
    currentUa: average(),
    batteryMv: average(),
  }
}

function tally(): Tally {
  return { yes: 0, no: 0 }
}

function average(): Average {
  return { sum: 0, frames: 0 }
}

function count(into: Tally, said: boolean | null): void {
  if (said === true) into.yes++
  else if (said === false) into.no++
}

function add(into: Average, value: number | null): void {
  if (value === null) return
  into.sum += value
  into.frames++
}

/** Mean of an average; null when nothing was measured. */
export function meanOfAverage(average: Average): number | null {
  return average.frames === 0 ? null : average.sum / average.frames
}

/** All that was measured said yes; null when nothing was measured. */
export function allYes(tally: Tally): boolean | null {
  return tally.yes + tally.no === 0 ? null : tally.no === 0
}

/** All that was measured said no; null when nothing was measured. */
export function allNo(tally: Tally): boolean | null {
  return tally.yes + tally.no === 0 ? null : tally.yes === 0
}

export function restartUnplugged(jack: JackWatch): void {
  jack.unplugged = { frames: 0, ringClosed: tally(), tipClosed: tally(), currentUa: average() }
}

export function takeUnpluggedFrame(jack: JackWatch, frame: Frame): void {
  jack.unplugged.frames++
  count(jack.unplugged.ringClosed, frame.ringSleeveClosed)
  count(jack.unplugged.tipClosed, frame.tipClosed)
  add(jack.unplugged.currentUa, frame.currentUa)
}

export function restartRest(jack: JackWatch): void {
  jack.rest = emptyRest()
}

export function takeRestFrame(jack: JackWatch, frame: Frame): void {
  jack.rest.frames++
  if (frame.plugged === false) jack.rest.plugOut++
  count(jack.rest.ringClosed, frame.ringSleeveClosed)
  count(jack.rest.tipClosed, frame.tipClosed)
  add(jack.rest.currentUa, frame.currentUa)
  add(jack.rest.batteryMv, frame.batteryMv)
}

/** Watches the wiggle from a moment on, or anew: the tip is measured again, what was seen stays. */
export function watchWiggle({ wiggle }: JackWatch, fromTenthMs: number, toTenthMs: number): void {
  cutWiggle(wiggle, fromTenthMs)
  wiggle.stretches.push({ fromTenthMs, toTenthMs })
  wiggle.tipFrames = 0
  wiggle.waitsForPlug = false
}

/** Ends the stretch that is being watched, if it has not ended. */
export function cutWiggle(wiggle: WiggleWatch, atTenthMs: number): void {
  const last = wiggle.stretches.at(-1)
  if (last !== undefined && last.toTenthMs > atTenthMs) last.toTenthMs = atTenthMs
}

export function takeWiggleFrame({ wiggle }: JackWatch, frame: Frame): void {
  count(wiggle.tipClosed, frame.tipClosed)
  if (frame.tipClosed !== null) wiggle.tipFrames++
}

/** Counts a contact disturbance of any pole that starts inside the wiggle, in any stretch of it. */
export function takeDisturbance(jack: JackWatch, event: Extract<BenchEvent, { kind: 'disturbance' }>): void {
  const { startTenthMs } = event
  const inside = jack.wiggle.stretches.some(
    ({ fromTenthMs, toTenthMs }) => startTenthMs >= fromTenthMs && startTenthMs < toTenthMs,
  )
  if (!inside) return
  jack.wiggle.count++
  jack.wiggle.longestTenthMs = Math.max(jack.wiggle.longestTenthMs, event.durationTenthMs)
}

export function takeContact(jack: JackWatch, event: Extract<BenchEvent, { kind: 'contact' }>): void {
  jack.contact[event.pole] = Math.max(jack.contact[event.pole] ?? 0, event.microOhm)
}

export function takeInsulation(jack: JackWatch, event: Extract<BenchEvent, { kind: 'insulation' }>): void {
  jack.insulationKiloOhm = Math.min(jack.insulationKiloOhm ?? Infinity, event.kiloOhm)
}

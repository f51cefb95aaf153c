import { NOT_MEASURED_MDB, SILENCE_MDB } from '../../src/shared/contract/quantities.ts'
import type { BenchEvent, Frame } from '../../src/shared/contract/frames.ts'
import type { RunSetup } from '../../src/shared/contract/runs.ts'
import { normalFrom, seededRandom } from '../../src/shared/measure/seededRandom.ts'
import { planRun } from '../../src/shared/measure/runPlan.ts'

/** What one pluck is like. Levels are those of the pluck's window, before noise: dBV, exact to the rounding of mdB. */
export interface PluckOptions {
  levelDb: number
  /** fall of the string, dB/s */
  decayDbPerS?: number
  /** from onset to damping */
  ringMs?: number
  /** muted time after it */
  restMs?: number
  /** dB by which the other elements lie below; Infinity: they hear nothing */
  crosstalkDb?: number
  /** the string's own element hears nothing; its neighbours do */
  ownSilent?: boolean
  /** pitch that the bench reports; null: none */
  hz?: number | null
  /** a second pitch, of a strum */
  secondHz?: number
  /** channel of the pitch report; 0 = jack */
  pitchChannel?: number
  confidencePercent?: number
  clipped?: number
  /** a second excitation, ms after the onset, 5 dB stronger: with its attack it lifts what still rings by 6 dB */
  secondOnsetMs?: number
  /** the string rings on instead of being damped */
  undamped?: boolean
}

export interface TraceOptions {
  /** noise of each channel, flat and A, dBV; -Infinity: digital silence */
  noiseDb?: number
  noiseADb?: number
  /** noise at the jack; null: the bench does not measure there (six-channel) */
  jackNoiseDb?: number | null
  /** sample standard deviation of a frame's noise level, dB */
  jitterDb?: number
  seed?: number
}

interface Ringing {
  channel: number
  /** dBV at its own start */
  startDb: number
  decayDbPerS: number
  fromFrame: number
  toFrame: number
}

const WINDOW = { fromMs: 50, toMs: 250 }

/** Writes a trace frame by frame: what a bench would send of a check. Deterministic by seed. */
export class TraceBuilder {
  readonly frames: Frame[] = []
  readonly events: BenchEvent[] = []
  private readonly setup: RunSetup
  private readonly channels: number
  private readonly options: Required<TraceOptions>
  private readonly normal: () => number
  private ringing: Ringing[] = []
  private plug: Pick<Frame, 'plugged' | 'ringSleeveClosed' | 'tipClosed' | 'currentUa' | 'batteryMv'>

  constructor(setup: RunSetup, options: TraceOptions = {}) {
    this.setup = setup
    this.channels = setup.channelKind === 'six' ? 6 : 1
    this.options = { noiseDb: -80, noiseADb: -88, jackNoiseDb: -76, jitterDb: 0.1, seed: 1, ...options }
    this.normal = normalFrom(seededRandom(this.options.seed))
    this.plug = this.plugState(true)
  }

  /** number of the next frame */
  get at(): number {
    return this.frames.length
  }

  private can(capability: RunSetup['capabilities'][number]): boolean {
    return this.setup.capabilities.includes(capability)
  }

  private plugState(plugged: boolean): TraceBuilder['plug'] {
    const has = this.can('plugState')
    return {
      plugged: has ? plugged : null,
      ringSleeveClosed: has ? plugged : null,
      tipClosed: this.can('tipContinuity') ? (plugged ? true : null) : null,
      currentUa: this.can('current') ? (plugged ? 1200 : 0) : null,
      batteryMv: this.can('battery') && plugged ? 9200 : null,
    }
  }

  /** What the bench says of plug, switch, supply from now on; a new plug state first sets all of it. */
  setPlug(plugged: boolean, change: Partial<TraceBuilder['plug']> = {}): this {
    this.plug = { ...this.plugState(plugged), ...change }
    return this
  }

  event(event: BenchEvent): this {
    this.events.push(event)
    return this
  }

  /** Frames of whatever rings and noise. */
  run(ms: number, change: Partial<Frame> = {}): this {
    const count = Math.round(ms / this.setup.frameMs)
    for (let i = 0; i < count; i++) this.frames.push({ ...this.frame(), ...change })
    return this
  }

  private mdb(power: number): number {
    return power <= 0 ? SILENCE_MDB : Math.round(10_000 * Math.log10(power))
  }

  private noisePower(levelDb: number): number {
    return Math.pow(10, (levelDb + this.options.jitterDb * this.normal()) / 10)
  }

  private frame(): Frame {
    const frameNo = this.at
    const { noiseDb, noiseADb, jackNoiseDb } = this.options
    const signal = Array.from({ length: 6 }, () => 0)
    for (const ring of this.ringing) {
      if (frameNo < ring.fromFrame || frameNo >= ring.toFrame) continue
      const seconds = ((frameNo - ring.fromFrame) * this.setup.frameMs) / 1000
      signal[ring.channel]! += Math.pow(10, (ring.startDb - ring.decayDbPerS * seconds) / 10)
    }
    const offset = (channel: number) => Math.pow(10, -(this.setup.calibrationDb[channel] ?? 0) / 10)
    const sum = signal.reduce((total, power) => total + power, 0)
    const own = this.channels === 6 ? signal : [sum]
    const flat = own.map((power, i) => this.mdb((power + this.noisePower(noiseDb)) * offset(i)))
    const a = own.map((power, i) => this.mdb((power + this.noisePower(noiseADb)) * offset(i)))
    const atJack = this.channels === 1 || (jackNoiseDb !== null && this.can('jackLevel'))
    const jackOffset = this.channels === 1 ? offset(0) : 1
    const jackPower = this.channels === 1 ? noiseDb : (jackNoiseDb ?? 0)
    return {
      levelMdb: flat,
      levelAMdb: this.can('noiseA') ? a : a.map(() => NOT_MEASURED_MDB),
      jackMdb:
        this.channels === 1
          ? flat[0]!
          : atJack
            ? this.mdb((sum + this.noisePower(jackPower)) * jackOffset)
            : NOT_MEASURED_MDB,
      jackAMdb:
        atJack && this.can('noiseA')
          ? this.channels === 1
            ? a[0]!
            : this.mdb((sum + this.noisePower(jackPower - 8)) * jackOffset)
          : NOT_MEASURED_MDB,
      clipped: 0,
      ...this.plug,
    }
  }

  /** Level at the onset that gives the wanted energy mean over the window. */
  private startDb(levelDb: number, decayDbPerS: number): number {
    const { frameMs } = this.setup
    let power = 0
    let frames = 0
    for (let ms = WINDOW.fromMs; ms + frameMs <= WINDOW.toMs; ms += frameMs) {
      power += Math.pow(10, (-decayDbPerS * ms) / 10_000)
      frames++
    }
    return levelDb - 10 * Math.log10(power / frames)
  }

  private excite(stringNo: number, options: PluckOptions, fromFrame: number, toFrame: number): void {
    const { levelDb, decayDbPerS = 8, crosstalkDb = 30, ownSilent = false } = options
    const startDb = this.startDb(levelDb, decayDbPerS)
    for (let channel = 0; channel < 6; channel++) {
      const own = channel === stringNo - 1
      if (own ? ownSilent : crosstalkDb === Infinity) continue
      if (this.channels === 1 && !own) continue
      const distance = own ? 0 : crosstalkDb + 3 * (Math.abs(channel - stringNo + 1) - 1)
      this.ringing.push({ channel, startDb: startDb - distance, decayDbPerS, fromFrame, toFrame })
    }
  }

  /** One pluck with its pitch report, then damped; returns the onset frame. */
  pluck(stringNo: number, options: PluckOptions): number {
    const { frameMs } = this.setup
    const { ringMs = 600, restMs = 400, clipped = 0 } = options
    const onset = this.at
    const end = options.undamped ? Infinity : onset + Math.round(ringMs / frameMs)
    this.excite(stringNo, options, onset, end)
    if (options.secondOnsetMs !== undefined) {
      const second = { ...options, levelDb: options.levelDb + 5 }
      this.excite(stringNo, second, onset + Math.round(options.secondOnsetMs / frameMs), end)
    }
    this.reportPitch(stringNo, options, onset)
    this.run(ringMs)
    if (clipped > 0) this.frames[onset + Math.round(100 / frameMs)]!.clipped = clipped
    this.run(options.undamped ? 0 : restMs)
    return onset
  }

  private reportPitch(stringNo: number, options: PluckOptions, onset: number): void {
    if (!this.can('pitch') || options.hz === null) return
    const own = this.setup.model.tuning[stringNo - 1]!.pitchesHz[0]!
    // a silent element reports nothing: its neighbour hears the string
    const heardBy = options.ownSilent ? (stringNo === 6 ? 5 : stringNo + 1) : stringNo
    const channel = options.pitchChannel ?? (this.channels === 6 ? heardBy : 0)
    const reports = [options.hz ?? own, ...(options.secondHz === undefined ? [] : [options.secondHz])]
    for (const hz of reports) {
      this.events.push({
        kind: 'pitch',
        frame: onset + Math.round(200 / this.setup.frameMs),
        startTenthMs: onset * this.setup.frameMs * 10 + 600,
        durationTenthMs: 1200,
        channel,
        milliHz: Math.round(hz * 1000),
        confidencePercent: options.confidencePercent ?? 90,
      })
    }
  }

  /** Takes a string out of what rings: the hand is on the strings. */
  damp(restMs = 400): this {
    this.ringing = []
    return this.run(restMs)
  }

  /** A drop-out of a contact in `ms` from now. */
  disturb(ms: number, durationMs: number, pole: 'tip' | 'ring' | 'sleeve' = 'tip'): this {
    const startTenthMs = this.at * this.setup.frameMs * 10 + ms * 10
    return this.event({
      kind: 'disturbance',
      pole,
      frame: Math.floor(startTenthMs / (this.setup.frameMs * 10)),
      startTenthMs,
      durationTenthMs: durationMs * 10,
    })
  }

  /** Something that happens with the next frame. */
  happen(kind: 'pedal' | 'discontinuity' | 'endOfSource'): this {
    return this.event({
      kind,
      frame: this.at,
      startTenthMs: this.at * this.setup.frameMs * 10,
      durationTenthMs: 0,
    })
  }

  /** A hum report over the `ms` before now. */
  hum(levelDb: number, ms: number, channel = 0): this {
    const end = this.at * this.setup.frameMs * 10
    return this.event({
      kind: 'hum',
      frame: this.at,
      startTenthMs: end - ms * 10,
      durationTenthMs: ms * 10,
      channel,
      mainsHz: this.setup.mainsHz,
      levelMdb: Math.round(levelDb * 1000),
    })
  }
}

/** One string of a whole check. */
export interface CheckString extends Partial<PluckOptions> {
  stringNo: number
  levelDb: number
  /** sample standard deviation of its plucks, laid in exactly as -s, 0, +s for three; more: seeded */
  scatterDb?: number
  /** plucks; the sheet's n when not said; 0 leaves the string out */
  plucks?: number
}

export interface CheckOptions extends TraceOptions {
  setup: RunSetup
  /** in the order that they are plucked; six sound strings from bass to treble at -20 dBV when not said */
  strings?: CheckString[]
  /** contact drop-outs inside the wiggle */
  disturbances?: { ms: number; durationMs: number }[]
  humDb?: number
  /** ends with 'end of source', as a recording does */
  endOfSource?: boolean
}

/** Six sound strings, bass to treble. */
export function soundStrings(levelDb = -20, scatterDb = 0.5): CheckString[] {
  return [6, 5, 4, 3, 2, 1].map((stringNo) => ({ stringNo, levelDb, scatterDb }))
}

/** A whole check as the phases of its plan ask for it: frames and events from before plugging in to the end. */
export function buildCheck(options: CheckOptions): { frames: Frame[]; events: BenchEvent[] } {
  const { setup, strings = soundStrings(), disturbances = [], humDb = -90 } = options
  const trace = new TraceBuilder(setup, options)
  const plan = planRun(setup)
  if (plan.phases.includes('unplugged')) trace.setPlug(false).run(1000)
  trace.setPlug(true)
  if (plan.phases.includes('settle')) trace.run(4000)
  if (plan.phases.includes('jackRest')) trace.run(1200)
  if (plan.phases.includes('noise')) {
    trace.run(plan.noiseStretchMs + 600)
    if (plan.judgesHum)
      trace.hum(humDb, plan.noiseStretchMs - 400, setup.channelKind === 'six' ? 0 : 0).run(400)
  }
  if (plan.phases.includes('strings')) pluckStrings(trace, setup, strings, options.seed ?? 1)
  if (plan.phases.includes('wiggle')) {
    trace.run(4000)
    for (const { ms, durationMs } of disturbances) trace.disturb(ms, durationMs)
    trace.run(setup.sheet.wiggleMs + 1000)
  }
  if (options.endOfSource) trace.happen('endOfSource').run(100)
  return { frames: trace.frames, events: trace.events }
}

function pluckStrings(
  trace: TraceBuilder,
  setup: RunSetup,
  strings: readonly CheckString[],
  seed: number,
): void {
  const normal = normalFrom(seededRandom(seed + 1))
  for (const { scatterDb = 0, plucks = setup.sheet.plucks.n, ...string } of strings) {
    for (let i = 0; i < plucks; i++) {
      const deviation = plucks === 3 ? (i - 1) * scatterDb : scatterDb * normal()
      trace.pluck(string.stringNo, { ...string, levelDb: string.levelDb + deviation })
    }
  }
}

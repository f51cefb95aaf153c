import type { BenchEvent, Frame, FrameMs } from '../../src/shared/contract/frames.ts'
import type { SourceStep } from '../sources/source.ts'
import { mdbOfPower, microOhmRead } from './benchInput.ts'
import type { BenchInput } from './benchInput.ts'
import { JACK } from './circuit.ts'
import type { Tuning } from './circuit.ts'
import { HumReports } from './humReports.ts'
import { POLES } from './instrument.ts'
import type { InstrumentParts } from './instrument.ts'
import { JackModel } from './jackState.ts'
import type { JackFrame } from './jackState.ts'
import { PitchReports } from './pitchReports.ts'
import type { Random } from './random.ts'
import { SignalPath } from './signalPath.ts'

/** Contact resistances are read so long after plugging in, s. */
const REST_READING_S = 2.5
const ATTACK_SCATTER_DB = 1.5
/** A hand notices a pluck that went wrong and does it again: no force lies further off than so many sigma. */
const SCATTER_LIMIT = 3
const PEDAL_TENTH_MS = 1000
const INSULATION_TEST_MILLIVOLT = 5000

export interface ModelledBenchOptions {
  parts: InstrumentParts
  bench: BenchInput
  tuning: Tuning
  frameMs: FrameMs
  mainsHz: 50 | 60
  /** standard deviation of a pluck's force, dB */
  scatterDb: number
  noiseStretchMs: number
  reads: { contacts: boolean; insulation: boolean; hum: boolean; pitch: boolean }
  /** a stream of chance for each part, so that none moves another */
  random: { noise: Random; pluck: Random; contact: Random; report: Random }
}

/** A modelled instrument lying on a modelled bench, moved on by one frame at a time. */
export class ModelledBench {
  private readonly options: ModelledBenchOptions
  private readonly jack: JackModel
  private readonly path: SignalPath
  private readonly pitches: PitchReports
  private readonly hums: HumReports
  private tuning: Tuning
  private waitingPlucks: number[] = []
  private pedalPressed = false
  private contactsWanted = false
  private pluckSeen = false

  constructor(options: ModelledBenchOptions) {
    const { parts, bench, tuning, frameMs, mainsHz, random } = options
    const frameS = frameMs / 1000
    this.options = options
    this.tuning = tuning
    this.jack = new JackModel(parts, frameS, random.contact)
    this.path = new SignalPath(parts, bench, tuning, frameS, mainsHz, random.noise)
    this.pitches = new PitchReports(bench.channelKind, frameMs, random.report)
    this.hums = new HumReports(bench.channelKind, frameMs, mainsHz, random.report)
    this.hums.restart(options.noiseStretchMs)
  }

  plug(): void {
    this.jack.plug()
  }

  unplug(): void {
    this.jack.unplug()
  }

  wiggle(): void {
    this.jack.wiggle()
  }

  /** A hand on all strings; also on those that were about to be plucked. */
  damp(): void {
    this.waitingPlucks = []
    this.path.damp()
  }

  pluck(stringNo: number): void {
    this.waitingPlucks.push(stringNo)
  }

  pedal(): void {
    this.pedalPressed = true
  }

  /** Reads the contacts at rest once more. */
  readContacts(): void {
    this.contactsWanted = true
  }

  isPlugged(): boolean {
    return this.jack.isPlugged()
  }

  /** The last pluck was to be seen at some point of measurement. */
  lastPluckSeen(): boolean {
    return this.pluckSeen
  }

  /** A run begins: its frames count from 0, its model may be tuned otherwise. */
  restart(tuning: Tuning, noiseStretchMs: number): void {
    this.tuning = tuning
    this.path.retune(tuning)
    this.jack.restart()
    this.pitches.restart()
    this.hums.restart(noiseStretchMs)
    this.waitingPlucks = []
    this.pedalPressed = false
  }

  step(frameNo: number): SourceStep {
    const events: BenchEvent[] = []
    this.startPlucks(frameNo)
    const state = this.jack.step(frameNo, events)
    const clipped = this.path.measure(state, frameNo)
    if (this.path.stringSeen(state)) this.pluckSeen = true
    this.readAtRest(state, frameNo, events)
    this.report(state, frameNo, events)
    if (this.pedalPressed) {
      this.pedalPressed = false
      events.push({ kind: 'pedal', ...this.placeOf(frameNo), durationTenthMs: PEDAL_TENTH_MS })
    }
    const frame = this.frameOf(state, clipped)
    this.path.advance()
    return { frame, events }
  }

  private placeOf(frameNo: number): { frame: number; startTenthMs: number; durationTenthMs: number } {
    const frameTenthMs = this.options.frameMs * 10
    return { frame: frameNo, startTenthMs: frameNo * frameTenthMs, durationTenthMs: frameTenthMs }
  }

  private startPlucks(frameNo: number): void {
    if (this.waitingPlucks.length === 0) return
    const { frameMs, scatterDb, random } = this.options
    for (const stringNo of this.waitingPlucks) {
      const intoFrame = Math.floor(random.pluck.uniform() * frameMs * 10) / (frameMs * 10)
      const force = {
        power: Math.pow(10, (scatterDb * random.pluck.normalWithin(SCATTER_LIMIT)) / 10),
        attackPower: Math.pow(10, (ATTACK_SCATTER_DB * random.pluck.normalWithin(SCATTER_LIMIT)) / 10),
      }
      this.path.pluck(stringNo, force, intoFrame)
      this.pitches.expect(stringNo, frameNo, Math.round((frameNo + intoFrame) * frameMs * 10))
    }
    this.pluckSeen = false
    this.waitingPlucks = []
  }

  private readAtRest(state: JackFrame, frameNo: number, events: BenchEvent[]): void {
    const { frameMs, reads, parts, bench, random } = this.options
    if (state.pluggedFrames === (REST_READING_S * 1000) / frameMs) this.contactsWanted = true
    if (!this.contactsWanted || !state.plugged) return
    this.contactsWanted = false
    const place = this.placeOf(frameNo)
    if (reads.contacts) {
      for (const pole of POLES) {
        const open = pole === 'tip' && parts.jack.tipOpen
        const ohm = open ? Number.POSITIVE_INFINITY : parts.jack.contactOhm[pole]
        events.push({ kind: 'contact', ...place, pole, microOhm: microOhmRead(bench, ohm, random.report) })
      }
    }
    if (reads.insulation) {
      const kiloOhm = Math.round((parts.jack.insulationOhm / 1000) * (1 + 0.01 * random.report.normal()))
      events.push({ kind: 'insulation', ...place, testMillivolt: INSULATION_TEST_MILLIVOLT, kiloOhm })
    }
  }

  private report(state: JackFrame, frameNo: number, events: BenchEvent[]): void {
    const { path } = this
    if (this.options.reads.pitch) {
      this.pitches.report(frameNo, events, {
        powerAt: (stringNo, point) => path.stringPowerAt(stringNo, point, state),
        noiseAt: (point) => path.noiseAt(point, state).flatPower,
        tuning: this.tuning,
      })
    }
    if (this.options.reads.hum) {
      const still = state.plugged && !state.wiggling && path.isQuiet(state)
      this.hums.report(frameNo, events, still, (point) => ({
        power: path.humAt(point, state),
        noisePower: path.noiseAt(point, state).flatPower,
      }))
    }
  }

  private frameOf(state: JackFrame, clipped: number): Frame {
    const { flat, a, firstPoint } = this.path
    const { bench, random } = this.options
    const [from, to] = firstPoint === JACK ? [JACK, JACK + 1] : [0, JACK]
    return {
      levelMdb: levelsOf(flat, from, to),
      levelAMdb: levelsOf(a, from, to),
      jackMdb: mdbOfPower(flat[JACK]!),
      jackAMdb: mdbOfPower(a[JACK]!),
      clipped,
      plugged: state.plugged,
      ringSleeveClosed: state.ringSleeveClosed,
      tipClosed: state.tipClosed,
      currentUa: Math.round(state.currentA * 1e6 * bench.currentRatio + 0.2 * random.report.normal()),
      batteryMv: Math.max(0, Math.round(state.batteryV * 1000 + random.report.normal())),
    }
  }
}

function levelsOf(powers: Float64Array, from: number, to: number): number[] {
  const levels: number[] = []
  for (let point = from; point < to; point++) levels.push(mdbOfPower(powers[point]!))
  return levels
}

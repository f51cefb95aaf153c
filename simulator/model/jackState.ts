import type { BenchEvent } from '../../src/shared/contract/frames.ts'
import { POLES } from './instrument.ts'
import type { InstrumentParts, Pole } from './instrument.ts'
import type { Random } from './random.ts'

/** A plug is moved for so long, s: four directions and a full turn. */
const WIGGLE_S = 7
/** Extra sag of a battery that was just loaded, as resistance, and how fast it comes, s. */
const POLARISATION_TAU_S = 5
/** Fall of the open voltage over the whole charge, V. */
const EMPTIES_BY_V = 2
/** What an open switch and its wiring leak, ohm. */
const OPEN_SWITCH_OHM = 200e6
const MOST_BREAK_S = 0.04

/** What jack, switch and supply do during one frame. */
export interface JackFrame {
  plugged: boolean
  ringSleeveClosed: boolean
  /** null while nothing is plugged in */
  tipClosed: boolean | null
  /** the preamp works */
  powered: boolean
  /** share of the frame in which the signal did not reach the bench */
  signalLost: number
  wiggling: boolean
  supplyV: number
  batteryV: number
  currentA: number
  /** power of the thump of plugging in, V^2 */
  thumpPower: number
  /** frames since the plug went in */
  pluggedFrames: number
}

interface Break {
  pole: Pole
  startTenthMs: number
  durationTenthMs: number
  restS: number
}

/** Voltage and current of the supply with the switch closed. */
export function loadedSupply(
  parts: InstrumentParts,
  chargeShareUsed = 0,
): { batteryV: number; currentA: number } {
  const { supply, preamp } = parts
  if (!supply.connected) return { batteryV: 0, currentA: 0 }
  const openV = supply.batteryV - EMPTIES_BY_V * chargeShareUsed
  const leakA = openV / (supply.leakOhm + supply.batteryOhm)
  const currentA = preamp.quiescentA + leakA
  return { batteryV: openV - currentA * supply.batteryOhm, currentA }
}

export function switchCloses(parts: InstrumentParts, plugged: boolean): boolean {
  if (parts.jack.switchState === 'works') return plugged
  return parts.jack.switchState === 'stuckClosed'
}

/** Peak voltage at which the output clips: half of the supply, less what each rail needs. */
export function clipPeakV(parts: InstrumentParts, supplyV: number): number {
  return Math.max(0, supplyV / 2 - parts.preamp.railDropV) * parts.preamp.volume
}

/** Plug, contacts, switch and supply, moved on by one frame at a time. */
export class JackModel {
  private readonly parts: InstrumentParts
  private readonly frameS: number
  private readonly random: Random
  private plugged = false
  private pluggedFrames = 0
  private wiggleFrames = 0
  private thumpPower = 0
  private usedAs = 0
  private sagV = 0
  private breaks: Break[] = []

  constructor(parts: InstrumentParts, frameS: number, random: Random) {
    this.parts = parts
    this.frameS = frameS
    this.random = random
  }

  plug(): void {
    if (this.plugged) return
    this.plugged = true
    this.pluggedFrames = 0
    this.thumpPower = this.parts.jack.thumpV ** 2
  }

  unplug(): void {
    this.plugged = false
    this.pluggedFrames = 0
    this.thumpPower = 0
    this.restart()
  }

  wiggle(): void {
    if (this.plugged) this.wiggleFrames = Math.round(WIGGLE_S / this.frameS)
  }

  isPlugged(): boolean {
    return this.plugged
  }

  /** A run begins: what was under way in another run's time is forgotten. */
  restart(): void {
    this.breaks = []
    this.wiggleFrames = 0
  }

  /** One frame; breaks of a contact that end in it are told as events. */
  step(frameNo: number, events: BenchEvent[]): JackFrame {
    const { parts, plugged } = this
    const wiggling = this.wiggleFrames > 0
    if (wiggling) {
      this.startBreaks(frameNo)
      this.wiggleFrames -= 1
    }
    if (plugged) this.pluggedFrames += 1
    const lost = this.lostShares(frameNo, events)
    const contact = switchCloses(parts, plugged)
    const supply = this.supply(contact)
    const broken = parts.jack.switchState === 'stuckClosed' ? 0 : Math.max(lost.ring, lost.sleeve)
    return {
      plugged,
      ringSleeveClosed: contact && broken < 0.5,
      tipClosed: plugged ? !parts.jack.tipOpen && lost.tip < 0.5 : null,
      // a capacitor behind the switch bridges a short break of the ring
      powered: contact && supply.supplyV >= parts.preamp.leastSupplyV,
      signalLost: parts.jack.tipOpen || !plugged ? 1 : Math.max(lost.tip, lost.sleeve),
      wiggling,
      supplyV: supply.supplyV,
      batteryV: supply.batteryV,
      currentA: supply.currentA * (1 - broken),
      thumpPower: this.thump(),
      pluggedFrames: this.pluggedFrames,
    }
  }

  private thump(): number {
    const now = this.thumpPower
    const step = Math.exp((-2 * this.frameS) / this.parts.jack.thumpTauS)
    this.thumpPower = now < 1e-20 ? 0 : now * step
    return now
  }

  private startBreaks(frameNo: number): void {
    const { breaksPerSecond, breakS } = this.parts.jack
    if (!(breaksPerSecond > 0)) return
    const { random, frameS } = this
    for (
      let atS = random.exponential(1 / breaksPerSecond);
      atS < frameS;
      atS += random.exponential(1 / breaksPerSecond)
    ) {
      const lengthS = Math.min(MOST_BREAK_S, Math.max(0.0001, breakS * Math.exp(0.9 * random.normal())))
      this.breaks.push({
        pole: POLES[Math.floor(random.uniform() * POLES.length)]!,
        startTenthMs: Math.floor((frameNo * frameS + atS) * 10_000),
        durationTenthMs: Math.max(1, Math.round(lengthS * 10_000)),
        restS: lengthS,
      })
    }
  }

  /** Share of this frame in which each pole is broken. */
  private lostShares(frameNo: number, events: BenchEvent[]): Record<Pole, number> {
    const lost: Record<Pole, number> = { tip: 0, ring: 0, sleeve: 0 }
    if (this.breaks.length === 0) return lost
    const left: Break[] = []
    for (const each of this.breaks) {
      const inFrameS = Math.min(each.restS, this.frameS)
      lost[each.pole] = Math.min(1, lost[each.pole] + inFrameS / this.frameS)
      each.restS -= inFrameS
      if (each.restS > 1e-9) {
        left.push(each)
        continue
      }
      const { pole, startTenthMs, durationTenthMs } = each
      events.push({ kind: 'disturbance', frame: frameNo, startTenthMs, durationTenthMs, pole })
    }
    this.breaks = left
    return lost
  }

  private supply(closed: boolean): { batteryV: number; currentA: number; supplyV: number } {
    const { supply } = this.parts
    if (!supply.connected) return { batteryV: 0, currentA: 0, supplyV: 0 }
    const used = Math.min(1, this.usedAs / supply.chargeAs)
    const sagStep = 1 - Math.exp(-this.frameS / POLARISATION_TAU_S)
    if (!closed) {
      this.sagV *= 1 - sagStep
      const batteryV = supply.batteryV - EMPTIES_BY_V * used - this.sagV
      return { batteryV, currentA: batteryV / OPEN_SWITCH_OHM, supplyV: 0 }
    }
    const loaded = loadedSupply(this.parts, used)
    this.sagV += (loaded.currentA * supply.batteryOhm * 2 - this.sagV) * sagStep
    this.usedAs += loaded.currentA * this.frameS
    const batteryV = Math.max(0, loaded.batteryV - this.sagV)
    return { batteryV, currentA: loaded.currentA, supplyV: batteryV }
  }
}

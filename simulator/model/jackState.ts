import type { BenchEvent } from '../../src/shared/contract/frames.ts'
import { POLES } from './instrument.ts'
import type { InstrumentParts, Pole } from './instrument.ts'
import type { Random } from './random.ts'

/** A plug is moved for so long, s: four directions and a full turn. */
const WIGGLE_S = 7
/** Extra sag of a battery that was just loaded, as resistance, and how fast it comes, s. */
const POLARISATION_TAU_S = 5

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

export interface JackModel {
  plug(): void
  unplug(): void
  wiggle(): void
  isPlugged(): boolean
  step(frameNo: number, events: BenchEvent[]): JackFrame
  /** A run begins: what began in another run's time is forgotten. */
  restart(): void
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
  const openV = supply.batteryV - 2 * chargeShareUsed
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

export function makeJackModel(parts: InstrumentParts, frameS: number, random: Random): JackModel {
  let plugged = false
  let pluggedFrames = 0
  let wiggleFrames = 0
  let thumpPower = 0
  let usedAs = 0
  let sag = 0
  let breaks: Break[] = []
  const thumpStep = Math.exp((-2 * frameS) / parts.jack.thumpTauS)
  const sagStep = 1 - Math.exp(-frameS / POLARISATION_TAU_S)
  const frameTenthMs = Math.round(frameS * 10_000)

  function startBreaks(frameNo: number): void {
    const rate = parts.jack.breaksPerSecond
    if (!(rate > 0)) return
    let atS = random.exponential(1 / rate)
    while (atS < frameS) {
      const lengthS = Math.min(0.04, Math.max(0.0001, parts.jack.breakS * Math.exp(0.9 * random.normal())))
      breaks.push({
        pole: POLES[Math.floor(random.uniform() * 3)]!,
        startTenthMs: frameNo * frameTenthMs + Math.floor(atS * 10_000),
        durationTenthMs: Math.max(1, Math.round(lengthS * 10_000)),
        restS: lengthS,
      })
      atS += random.exponential(1 / rate)
    }
  }

  /** Share of this frame in which each pole is broken; breaks that end here are told. */
  function lostShares(frameNo: number, events: BenchEvent[]): Record<Pole, number> {
    const lost: Record<Pole, number> = { tip: 0, ring: 0, sleeve: 0 }
    if (breaks.length === 0) return lost
    const left: Break[] = []
    for (const each of breaks) {
      const inFrameS = Math.min(each.restS, frameS)
      lost[each.pole] = Math.min(1, lost[each.pole] + inFrameS / frameS)
      each.restS -= inFrameS
      if (each.restS > 1e-9) {
        left.push(each)
        continue
      }
      const { pole, startTenthMs, durationTenthMs } = each
      events.push({ kind: 'disturbance', frame: frameNo, startTenthMs, durationTenthMs, pole })
    }
    breaks = left
    return lost
  }

  function supplyNow(closed: boolean): { batteryV: number; currentA: number; supplyV: number } {
    const { supply } = parts
    if (!supply.connected) return { batteryV: 0, currentA: 0, supplyV: 0 }
    const used = Math.min(1, usedAs / supply.chargeAs)
    if (!closed) {
      sag *= 1 - sagStep
      const openV = supply.batteryV - 2 * used - sag
      return { batteryV: openV, currentA: openV / 200e6, supplyV: 0 }
    }
    const loaded = loadedSupply(parts, used)
    sag += (loaded.currentA * supply.batteryOhm * 2 - sag) * sagStep
    usedAs += loaded.currentA * frameS
    const batteryV = Math.max(0, loaded.batteryV - sag)
    return { batteryV, currentA: loaded.currentA, supplyV: batteryV }
  }

  return {
    plug() {
      if (plugged) return
      plugged = true
      pluggedFrames = 0
      thumpPower = parts.jack.thumpV ** 2
    },
    unplug() {
      plugged = false
      pluggedFrames = 0
      wiggleFrames = 0
      thumpPower = 0
      breaks = []
    },
    wiggle() {
      if (plugged) wiggleFrames = Math.round(WIGGLE_S / frameS)
    },
    isPlugged: () => plugged,
    restart() {
      breaks = []
      wiggleFrames = 0
    },
    step(frameNo, events) {
      const wiggling = wiggleFrames > 0
      if (wiggling) {
        startBreaks(frameNo)
        wiggleFrames -= 1
      }
      if (plugged) pluggedFrames += 1
      const lost = lostShares(frameNo, events)
      const tipClosed = plugged ? !parts.jack.tipOpen && lost.tip < 0.5 : null
      const contact = switchCloses(parts, plugged)
      const supply = supplyNow(contact)
      // a capacitor behind the switch bridges a short break of the ring
      const powered = contact && supply.supplyV >= parts.preamp.leastSupplyV
      const broken = parts.jack.switchState === 'stuckClosed' ? 0 : Math.max(lost.ring, lost.sleeve)
      const thump = thumpPower
      thumpPower = thumpPower < 1e-20 ? 0 : thumpPower * thumpStep
      return {
        plugged,
        ringSleeveClosed: contact && broken < 0.5,
        tipClosed,
        powered,
        signalLost: parts.jack.tipOpen || !plugged ? 1 : Math.max(lost.tip, lost.sleeve),
        wiggling,
        supplyV: supply.supplyV,
        batteryV: supply.batteryV,
        currentA: supply.currentA * (1 - broken),
        thumpPower: thump,
        pluggedFrames,
      }
    },
  }
}

import type { Fault } from '../../src/shared/contract/simulation.ts'
import { makeRandom } from './random.ts'
import { ratioOfDb, SHIELDED_COUPLING_F } from './instrument.ts'
import type { InstrumentParts } from './instrument.ts'

/** The string a fault sits at when it was not told: the seed chooses. */
export function stringOfFault(parts: InstrumentParts, fault: Fault): number {
  if (fault.stringNo !== undefined) return fault.stringNo
  if (fault.fault === 'stripEndLump') return 1
  return 1 + Math.floor(makeRandom(parts.seed, `string of ${fault.fault}`).uniform() * 6)
}

/**
 * Lays a fault into the parts: capacitances, resistances, gains, forces and contacts. What a reading makes of it
 * follows from the circuit. Severity 0 is barely there, 1 plain, 3 gross; broken parts know no severity.
 */
export function applyFault(parts: InstrumentParts, fault: Fault): void {
  const { severity } = fault
  const index = stringOfFault(parts, fault) - 1
  const element = parts.elements[index]!
  switch (fault.fault) {
    case 'elementOpen':
      element.state = 'open'
      return
    case 'elementShorted':
      element.state = 'shorted'
      return
    case 'stripShorted':
      for (const each of parts.elements) each.state = 'shorted'
      return
    case 'poorSeating':
      element.seating *= ratioOfDb(-1.5 - 3.5 * severity)
      return
    case 'endsTight':
      press(parts, [1, 0.25, 0, 0, 0.25, 1], -1.5 - 4 * severity)
      return
    case 'hollowMiddle':
      press(parts, [0, 0.2, 1, 1, 0.2, 0], -1.5 - 4.5 * severity)
      return
    case 'tiltedSaddle':
      // more force at the bass end, less at the treble end
      press(parts, [1, 0.6, 0.2, -0.2, -0.6, -1], -1 - 1.8 * severity)
      return
    case 'stripEndLump':
      element.seating *= ratioOfDb(-2 - 4.5 * severity)
      return
    case 'crossedLeads': {
      const other = index === 5 ? 4 : index + 1
      const lead = parts.leads[index]!
      parts.leads[index] = parts.leads[other]!
      parts.leads[other] = lead
      return
    }
    case 'polarityFlipped':
      element.polarity = element.polarity === 1 ? -1 : 1
      return
    case 'inputLoading':
      // a strip of six is loaded as much by a sixth of the resistance
      parts.preamp.loadOhm = (parts.circuit === 'parallel' ? 1 / 6 : 1) * 1e6 * Math.pow(3, 1 - severity)
      return
    case 'noPower':
      parts.supply.connected = false
      return
    case 'volumeDown':
      parts.preamp.volume *= ratioOfDb(-3 - 7 * severity)
      return
    case 'lowBattery':
      parts.supply.batteryV = 7.6 - 1.4 * severity
      parts.supply.batteryOhm = 30 + 60 * severity
      parts.supply.chargeAs = 60
      return
    case 'shieldOpen': {
      const opened = fault.stringNo === undefined ? parts.elements : [element]
      for (const each of opened) each.fieldCouplingF = SHIELDED_COUPLING_F * 12 * Math.pow(7, severity)
      return
    }
    case 'dimmerBuzz':
      parts.room.fieldV = withBuzz(parts.room.fieldV, 10 * Math.pow(5, severity))
      return
    case 'hissyPreamp':
      parts.preamp.voltageNoise *= ratioOfDb(10 + 9 * severity)
      return
    case 'crackle':
      parts.crackle = { perSecond: 0.5 + severity, burstC: 0.8e-12 * Math.pow(2.5, severity), element: index }
      return
    case 'wornJack':
      parts.jack.breaksPerSecond = 0.4 + 1.6 * severity
      parts.jack.breakS = 0.0015 * (1 + severity)
      for (const pole of ['tip', 'ring', 'sleeve'] as const) {
        parts.jack.contactOhm[pole] += 0.03 + 0.07 * severity * (pole === 'tip' ? 1.4 : 1)
      }
      return
    case 'switchStuckClosed':
      parts.jack.switchState = 'stuckClosed'
      return
    case 'switchStuckOpen':
      parts.jack.switchState = 'stuckOpen'
      return
    case 'currentHigh':
      parts.supply.leakOhm = 3300 * Math.pow(0.32, severity)
      return
    case 'tipOpen':
      parts.jack.tipOpen = true
      return
    case 'benchHum':
      parts.benchLoopV = [1, 0.2, 0.5, 0.1, 0.3].map((share) => share * ratioOfDb(-72 + 6 * severity))
      return
  }
}

export function applyFaults(parts: InstrumentParts, faults: readonly Fault[]): InstrumentParts {
  for (const fault of faults) applyFault(parts, fault)
  return parts
}

/** Changes the force on each element by a share of so many dB. */
function press(parts: InstrumentParts, shares: readonly number[], db: number): void {
  shares.forEach((share, i) => {
    parts.elements[i]!.seating *= ratioOfDb(share * db)
  })
}

/** A phase-cut load: even multiples of the mains frequency, slowly falling, far beyond 1 kHz. */
function withBuzz(fieldV: readonly number[], factor: number): number[] {
  const base = fieldV[0] ?? 0
  return Array.from({ length: 60 }, (_, i) => {
    const order = i + 1
    const clean = fieldV[i] ?? 0
    return order % 2 === 0 ? clean + (base * factor * 0.2) / Math.pow(order / 2, 0.7) : clean
  })
}

import { describe, expect, it } from 'vitest'
import {
  compileCircuit,
  elementDivider,
  inputNodes,
  inputNoiseDensity,
  parallelOhm,
  STANDARD_TUNING,
} from '../../../simulator/model/circuit.ts'
import { makeInstrument } from '../../../simulator/model/instrument.ts'
import type { InstrumentParts } from '../../../simulator/model/instrument.ts'
import { capacitorNoisePower, johnsonDensity } from '../../../simulator/model/noisePhysics.ts'

/** Six equal elements without lead capacitance, so that textbook arithmetic holds exactly. */
function equalElements(circuit: 'parallel' | 'buffered', picofarad = 500): InstrumentParts {
  const parts = makeInstrument(1, circuit)
  for (const element of parts.elements) element.capacitanceF = picofarad * 1e-12
  parts.preamp.leadF = 0
  return parts
}

function risesDb(parts: InstrumentParts, change: (parts: InstrumentParts) => void): number[] {
  const before = parts.elements.map((_, e) => elementDivider(parts, e))
  change(parts)
  return parts.elements.map((_, e) => 20 * Math.log10(elementDivider(parts, e) / before[e]!))
}

describe('elementDivider()', () => {
  it('lets five of six parallel elements rise by 20 lg(6/5) = 1.58 dB when one is open', () => {
    const rises = risesDb(equalElements('parallel'), (parts) => {
      parts.elements[2]!.state = 'open'
    })
    expect(rises[2]).toBe(-Infinity)
    for (const e of [0, 1, 3, 4, 5]) expect(rises[e]).toBeCloseTo(1.5836, 3)
  })

  it('lets four rise by 3.5 dB when two are open', () => {
    const rises = risesDb(equalElements('parallel'), (parts) => {
      parts.elements[0]!.state = 'open'
      parts.elements[5]!.state = 'open'
    })
    for (const e of [1, 2, 3, 4]) expect(rises[e]).toBeCloseTo(3.52, 2)
  })

  it('still gives 1.6 dB with real capacitances and a lead', () => {
    const rises = risesDb(makeInstrument(5, 'parallel'), (parts) => {
      parts.elements[3]!.state = 'open'
    })
    for (const e of [0, 1, 2, 4, 5]) expect(rises[e]).toBeCloseTo(1.6, 0)
  })

  it('kills all six when one of a parallel strip is shorted', () => {
    const parts = equalElements('parallel')
    parts.elements[4]!.state = 'shorted'
    expect(parts.elements.map((_, e) => elementDivider(parts, e))).toEqual([0, 0, 0, 0, 0, 0])
  })

  it.each(['open', 'shorted'] as const)('changes only the bad element of a buffered set (%s)', (state) => {
    const rises = risesDb(equalElements('buffered'), (parts) => {
      parts.elements[2]!.state = state
    })
    expect(rises[2]).toBe(-Infinity)
    for (const e of [0, 1, 3, 4, 5]) expect(rises[e]).toBe(0)
  })

  // 300 pF element with 30, 60, 100 pF of lead: -0.8, -1.6, -2.5 dB (textbook arithmetic)
  it.each([
    [30, -0.8],
    [60, -1.6],
    [100, -2.5],
  ])('a lead of %d pF before its buffer costs %d dB', (leadPf, lossDb) => {
    const rises = risesDb(equalElements('buffered', 300), (parts) => {
      parts.preamp.leadF = leadPf * 1e-12
    })
    expect(rises[0]).toBeCloseTo(lossDb, 1)
  })
})

describe('inputNoiseDensity()', () => {
  /** The node alone: no noise of the input itself. */
  function quietInput(): InstrumentParts {
    const parts = makeInstrument(1, 'buffered')
    parts.preamp.voltageNoise = 0
    parts.preamp.currentNoise = 0
    parts.room.temperatureK = 300
    return parts
  }

  it('is 4kTR of the bias resistance far below the corner', () => {
    const parts = quietInput()
    const node = inputNodes(parts)[0]!
    expect(inputNoiseDensity(parts, node, 1e-3) / johnsonDensity(parts.preamp.biasOhm, 300)).toBeCloseTo(1, 6)
  })

  it('adds up to kT/C of the node over all frequencies', () => {
    const parts = quietInput()
    const node = inputNodes(parts)[0]!
    let power = 0
    const step = 0.001
    for (let logHz = -4; logHz < 8; logHz += step) {
      const hz = 10 ** (logHz + step / 2)
      power += inputNoiseDensity(parts, node, hz) * hz * step * Math.LN10
    }
    expect(power / capacitorNoisePower(node.capacitanceF, 300)).toBeCloseTo(1, 3)
  })

  it('leaves only the voltage noise of a shorted input', () => {
    const parts = makeInstrument(1, 'buffered')
    parts.elements[0]!.state = 'shorted'
    const { voltageNoise, flickerHz } = parts.preamp
    const density = inputNoiseDensity(parts, inputNodes(parts)[0]!, 1000)
    expect(density).toBeCloseTo(voltageNoise ** 2 * (1 + flickerHz / 1000), 22)
  })

  it('hisses more at an open input, where only the lead holds the resistance down', () => {
    const parts = makeInstrument(1, 'buffered')
    const sound = compileCircuit(parts, STANDARD_TUNING, 50, 0.01).noise[1]!.flatPower
    parts.elements[1]!.state = 'open'
    const open = compileCircuit(parts, STANDARD_TUNING, 50, 0.01).noise[1]!.flatPower
    expect(10 * Math.log10(open / sound)).toBeGreaterThan(6)
  })
})

describe('compileCircuit()', () => {
  it('keeps healthy noise at the input within -115..-103 dBV, where onboard preamps are told to be', () => {
    for (const circuit of ['buffered', 'parallel'] as const) {
      for (let seed = 1; seed <= 20; seed++) {
        const parts = makeInstrument(seed, circuit)
        const { noise } = compileCircuit(parts, STANDARD_TUNING, 50, 0.01)
        const inputDb = 10 * Math.log10(noise[0]!.flatPower / parts.preamp.gain ** 2)
        expect(inputDb).toBeGreaterThan(-115)
        expect(inputDb).toBeLessThan(-103)
      }
    }
  })

  it('parallelOhm() of an infinite and a finite resistance is the finite one', () => {
    expect(parallelOhm(Number.POSITIVE_INFINITY, 1e6)).toBeCloseTo(1e6, 6)
  })
})

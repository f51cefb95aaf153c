import { aWeightingPower, bandNoise, cornerHz, highPassPower, johnsonDensity } from './noisePhysics.ts'
import type { BandNoise } from './noisePhysics.ts'
import { ATTACK_HZ, PARTIAL_COUNT, PARTIAL_ORDERS } from './partials.ts'
import type { ElementParts, InstrumentParts } from './instrument.ts'

/** Six element channels, then the jack. */
export const JACK = 6
export const POINTS = 7

/** What a run's expected pitches make of the strings, Hz, string 1 first. */
export type Tuning = readonly number[]

/** Fundamentals of the six open strings, Hz: equal temperament at A4 = 440 Hz (ISO 16). */
export const STANDARD_TUNING: Tuning = [329.6276, 246.9417, 195.9977, 146.8324, 110, 82.4069]

/** How one string is heard at every point: power gain of each group of partials, flat and A-weighted. */
export interface StringPaths {
  /** [point][group] */
  flat: Float64Array[]
  a: Float64Array[]
  /** [point] of the attack */
  attack: Float64Array
  attackA: Float64Array
}

export interface MainsPower {
  /** all harmonics, flat and A-weighted, V^2 */
  flat: number
  a: number
  /** of that the fundamental alone, whose power in one frame can swing with its phase */
  fundamental: number
  fundamentalA: number
  /** harmonics up to 1 kHz, as a hum reading takes them */
  hum: number
}

/** Everything about the instrument's signal path that stays as it is between two changes of its parts. */
export interface CompiledCircuit {
  strings: StringPaths[]
  /** noise at each point, working */
  noise: BandNoise[]
  mains: MainsPower[]
  /** power at each point for a charge of 1 coulomb at the input that crackles */
  chargeGain: number[]
}

/** One input of the preamp with what hangs on it. */
interface InputNode {
  resistanceOhm: number
  capacitanceF: number
  shorted: boolean
  cornerHz: number
}

/** Resistances side by side. */
export function parallelOhm(...resistancesOhm: number[]): number {
  return 1 / resistancesOhm.reduce((sum, ohm) => sum + 1 / ohm, 0)
}

/** The input node of each element: its own in a buffered circuit, the common one in a parallel circuit. */
export function inputNodes(parts: InstrumentParts): InputNode[] {
  const { preamp, elements } = parts
  if (parts.circuit === 'buffered') return elements.map((element) => nodeOf([element], preamp))
  const common = nodeOf(elements, preamp)
  return elements.map(() => common)
}

function nodeOf(elements: readonly ElementParts[], preamp: InstrumentParts['preamp']): InputNode {
  const joined = elements.filter((element) => element.state !== 'open')
  const capacitanceF = preamp.leadF + joined.reduce((sum, element) => sum + element.capacitanceF, 0)
  const resistanceOhm = parallelOhm(preamp.biasOhm, preamp.loadOhm, ...joined.map((each) => each.leakOhm))
  return {
    resistanceOhm,
    capacitanceF,
    shorted: joined.some((element) => element.state === 'shorted'),
    cornerHz: cornerHz(resistanceOhm, capacitanceF),
  }
}

/**
 * Voltage gain from an element's own voltage to its input node, well above the corner: its capacitance against all
 * that hangs there. This is where five strings rise by 1.6 dB when one of six parallel elements is open.
 */
export function elementDivider(parts: InstrumentParts, elementIndex: number): number {
  const element = parts.elements[elementIndex]!
  const node = inputNodes(parts)[elementIndex]!
  if (element.state !== 'sound' || node.shorted) return 0
  return element.capacitanceF / node.capacitanceF
}

/**
 * Density of the noise at an input node, V^2 per Hz: Johnson noise of the resistance across the node, the input's
 * current noise on the node's impedance, and its voltage noise, which the capacitance does not shape.
 */
export function inputNoiseDensity(
  parts: InstrumentParts,
  node: { resistanceOhm: number; capacitanceF: number; shorted: boolean },
  frequencyHz: number,
): number {
  const { preamp, room } = parts
  const voltage = preamp.voltageNoise ** 2 * (1 + preamp.flickerHz / frequencyHz)
  if (node.shorted) return voltage
  const turn = 2 * Math.PI * frequencyHz * node.resistanceOhm * node.capacitanceF
  const lowPass = 1 / (1 + turn * turn)
  const thermal = johnsonDensity(node.resistanceOhm, room.temperatureK) * lowPass
  const current = (preamp.currentNoise * node.resistanceOhm) ** 2 * lowPass
  return voltage + thermal + current
}

const COHERENT_SHARE = 0.4

/** Works out the paths of six strings, the noise and the hum at every point. */
export function compileCircuit(
  parts: InstrumentParts,
  tuning: Tuning,
  mainsHz: number,
  frameS: number,
): CompiledCircuit {
  const nodes = inputNodes(parts)
  const gain = parts.preamp.gain * parts.preamp.volume
  const own = parts.elements.map(
    (element, e) =>
      gain * elementDivider(parts, e) * element.sensitivity * element.seating * element.polarity,
  )
  const nodeCount = parts.circuit === 'parallel' ? 1 : 6
  const output = parts.preamp.outputNoise ** 2
  const noiseOf = (inputs: InputNode[]): BandNoise =>
    bandNoise((frequency) => {
      const input = inputs.reduce((sum, node) => sum + inputNoiseDensity(parts, node, frequency), 0)
      return input * gain * gain + output
    }, frameS)
  const channelNoise = nodes.map((node) => noiseOf([node]))
  return {
    strings: tuning.map((fundamentalHz, s) => pathsOf(parts, nodes, own, fundamentalHz, s)),
    noise: [...parts.leads.map((e) => channelNoise[e]!), noiseOf(nodes.slice(0, nodeCount))],
    mains: mainsAt(parts, nodes, gain, mainsHz),
    chargeGain: chargeGains(parts, nodes, gain),
  }
}

/** A charge at an input is a voltage on its capacitance; behind buffers only that channel and the jack have it. */
function chargeGains(parts: InstrumentParts, nodes: readonly InputNode[], gain: number): number[] {
  const node = nodes[parts.crackle.element]!
  const power = node.shorted ? 0 : (gain / node.capacitanceF) ** 2
  const here = (e: number): boolean => parts.circuit === 'parallel' || e === parts.crackle.element
  return [...parts.leads.map((e) => (here(e) ? power : 0)), power]
}

function pathsOf(
  parts: InstrumentParts,
  nodes: readonly InputNode[],
  own: readonly number[],
  fundamentalHz: number,
  stringIndex: number,
): StringPaths {
  const flat = Array.from({ length: POINTS }, () => new Float64Array(PARTIAL_COUNT))
  const a = Array.from({ length: POINTS }, () => new Float64Array(PARTIAL_COUNT))
  const attack = new Float64Array(POINTS)
  const attackA = new Float64Array(POINTS)
  const heard = parts.crosstalk[stringIndex]!.map((ratio, e) => ratio * own[e]!)

  const powersAt = (frequencyHz: number): number[] => {
    const amplitude = heard.map(
      (value, e) => value * Math.sqrt(highPassPower(frequencyHz, nodes[e]!.cornerHz)),
    )
    const channels = parts.leads.map((e) => amplitude[e]! * amplitude[e]!)
    return [...channels, jackPower(amplitude, stringIndex)]
  }
  PARTIAL_ORDERS.forEach((order, g) => {
    const frequencyHz = fundamentalHz * order
    const weight = aWeightingPower(frequencyHz)
    powersAt(frequencyHz).forEach((power, point) => {
      flat[point]![g] = power
      a[point]![g] = power * weight
    })
  })
  powersAt(ATTACK_HZ).forEach((power, point) => {
    attack[point] = power
    attackA[point] = power * aWeightingPower(ATTACK_HZ)
  })
  return { flat, a, attack, attackA }
}

/**
 * The jack hears the sum of all six. The saddle hands a part of a string's force straight to the neighbours: that
 * part is in phase and adds as amplitude, so a flipped neighbour takes it away. The rest goes by the body and adds
 * as power. The split is an assumption, no source.
 */
function jackPower(amplitude: readonly number[], stringIndex: number): number {
  let inPhase = 0
  let power = 0
  amplitude.forEach((value, e) => {
    const distance = Math.abs(e - stringIndex)
    const coherent = distance === 0 ? 1 : distance === 1 ? COHERENT_SHARE : 0
    inPhase += value * Math.sqrt(coherent)
    power += value * value * (1 - coherent)
  })
  return inPhase * inPhase + power
}

/** Hum at every point: the room's field through what the shields let pass, with the same corner as the signal. */
function mainsAt(
  parts: InstrumentParts,
  nodes: readonly InputNode[],
  gain: number,
  mainsHz: number,
): MainsPower[] {
  const points = Array.from({ length: POINTS }, () => emptyMains())
  parts.room.fieldV.forEach((fieldV, i) => {
    const frequencyHz = mainsHz * (i + 1)
    const amplitude = parts.elements.map((element, e) => {
      const node = nodes[e]!
      if (node.shorted) return 0
      const share = element.fieldCouplingF / node.capacitanceF
      return fieldV * share * gain * Math.sqrt(highPassPower(frequencyHz, node.cornerHz))
    })
    // the field has the same phase everywhere, so the six add as amplitudes
    const sum = amplitude.reduce((total, value) => total + value, 0)
    const channels =
      parts.circuit === 'parallel' ? amplitude.map(() => sum) : parts.leads.map((e) => amplitude[e]!)
    ;[...channels, sum].forEach((value, point) => addHarmonic(points[point]!, frequencyHz, i === 0, value))
  })
  return points
}

export function emptyMains(): MainsPower {
  return { flat: 0, a: 0, fundamental: 0, fundamentalA: 0, hum: 0 }
}

/** Adds one harmonic of an amplitude in V rms. */
export function addHarmonic(
  mains: MainsPower,
  frequencyHz: number,
  isFundamental: boolean,
  rmsV: number,
): void {
  const power = rmsV * rmsV
  const weighted = power * aWeightingPower(frequencyHz)
  mains.flat += power
  mains.a += weighted
  if (frequencyHz <= 1000) mains.hum += power
  if (isFundamental) {
    mains.fundamental += power
    mains.fundamentalA += weighted
  }
}

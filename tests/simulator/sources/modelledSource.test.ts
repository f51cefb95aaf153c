import { describe, expect, it } from 'vitest'
import { BenchEvent, BenchVerify, Frame } from '../../../src/shared/contract/frames.ts'
import type { Fault } from '../../../src/shared/contract/simulation.ts'
import { compileCircuit, STANDARD_TUNING } from '../../../simulator/model/circuit.ts'
import { truthOf } from '../../../simulator/model/truthOf.ts'
import { makeModelledSource } from '../../../simulator/sources/modelledSource.ts'
import type { ModelledSource, ModelledSourceOptions } from '../../../simulator/sources/modelledSource.ts'
import type { SourceStep } from '../../../simulator/sources/source.ts'
import { buildOrder } from '../../helpers/countingSource.ts'

const SETTLED_FRAMES = 800

/** A source in a run, and a hand that moves it on. */
function makeBench(options: Partial<ModelledSourceOptions> = {}) {
  const source = makeModelledSource({ seed: 21, channelKind: 'six', circuit: 'buffered', ...options })
  source.start(buildOrder())
  let frameNo = 0
  const frames = (count: number): SourceStep[] =>
    Array.from({ length: count }, () => {
      const step = source.next(frameNo++)
      if (typeof step === 'string') throw new Error('an instrument never ends')
      return step
    })
  return { source, frames }
}

function pluggedBench(options: Partial<ModelledSourceOptions> = {}) {
  const bench = makeBench(options)
  bench.source.simulate({ kind: 'plug' })
  bench.frames(SETTLED_FRAMES)
  return bench
}

function place(source: ModelledSource, faults: Fault[], scatterDb = 0): void {
  source.simulate({ kind: 'place', seed: 21, faults, scatterDb })
}

const eventsOf = (steps: SourceStep[]): BenchEvent[] => steps.flatMap((step) => step.events)

function meanLevelDb(steps: SourceStep[], levelOf: (frame: Frame) => number): number {
  const power = steps.reduce((sum, step) => sum + 10 ** (levelOf(step.frame) / 10_000), 0) / steps.length
  return 10 * Math.log10(power)
}

describe('makeModelledSource()', () => {
  it('gives the same stream for the same seed and commands, and another for another seed', () => {
    const stream = (seed: number): string => {
      const { source, frames } = makeBench({ seed })
      source.simulate({ kind: 'plug' })
      const steps = frames(300)
      source.simulate({ kind: 'pluck', stringNo: 4 })
      return JSON.stringify([...steps, ...frames(100)])
    }
    expect(stream(5)).toBe(stream(5))
    expect(stream(6)).not.toBe(stream(5))
  })

  it.each(['six', 'one'] as const)('sends only what the contract knows (%s)', (channelKind) => {
    const { source, frames } = makeBench({ channelKind })
    const faults: Fault[] = [
      { fault: 'wornJack', severity: 3 },
      { fault: 'crackle', severity: 2 },
      { fault: 'lowBattery', severity: 3 },
    ]
    place(source, faults, 2)
    source.simulate({ kind: 'plug' })
    frames(700)
    for (const stringNo of [1, 3, 6]) source.simulate({ kind: 'pluck', stringNo })
    source.simulate({ kind: 'wiggle' })
    source.simulate({ kind: 'pedal' })
    let from = 700
    for (const step of frames(900)) {
      Frame.parse(step.frame)
      expect(step.frame.levelMdb).toHaveLength(channelKind === 'six' ? 6 : 1)
      for (const event of step.events) expect(BenchEvent.parse(event).frame).toBe(from)
      from += 1
    }
  })

  it('reads in the window what the truth says, at the element and at the jack', () => {
    const { source, frames } = pluggedBench()
    place(source, [])
    source.start(buildOrder())
    source.simulate({ kind: 'plug' })
    frames(SETTLED_FRAMES)
    const truth = truthOf(source.parts)
    for (const stringNo of [1, 2, 3, 4, 5, 6]) {
      source.simulate({ kind: 'damp' })
      frames(60)
      source.simulate({ kind: 'pluck', stringNo })
      const steps = frames(40)
      const window = steps.slice(5, 25)
      // the pluck starts somewhere in its frame: at 29 dB/s a frame is 0.3 dB; the bench's own gain is within 0.08 dB
      expect(
        Math.abs(meanLevelDb(window, (f) => f.levelMdb[stringNo - 1]!) - truth.levelDb[stringNo - 1]!),
      ).toBeLessThan(0.4)
      expect(Math.abs(meanLevelDb(window, (f) => f.jackMdb) - truth.jackLevelDb[stringNo - 1]!)).toBeLessThan(
        0.4,
      )
    }
  })

  it('reads the noise of the circuit, with the spread that a 10 ms rms must have', () => {
    const { source, frames } = pluggedBench()
    const { noise } = compileCircuit(source.parts, STANDARD_TUNING, 50, 0.01)
    const steps = frames(3000)
    const powers = steps.map((step) => 10 ** (step.frame.jackMdb / 10_000))
    const mean = powers.reduce((sum, power) => sum + power, 0) / powers.length
    expect(10 * Math.log10(mean)).toBeCloseTo(truthOf(source.parts).noiseFlatDb[6]!, 0)
    const deviation = Math.sqrt(
      powers.reduce((sum, power) => sum + (power - mean) ** 2, 0) / (powers.length - 1),
    )
    // relative standard deviation of a mean square with nu degrees of freedom: sqrt(2 / nu); hum adds level, not spread
    const hiss = noise[6]!.flatPower / mean
    const expected = hiss * Math.sqrt(2 / noise[6]!.flatDof)
    expect(deviation / mean / expected).toBeGreaterThan(0.9)
    expect(deviation / mean / expected).toBeLessThan(1.1)
  })

  it('scatters as the hand does', () => {
    const { source, frames } = pluggedBench()
    place(source, [], 2)
    source.simulate({ kind: 'plug' })
    frames(SETTLED_FRAMES)
    const levels = Array.from({ length: 150 }, () => {
      source.simulate({ kind: 'damp' })
      frames(30)
      source.simulate({ kind: 'pluck', stringNo: 6 })
      return meanLevelDb(frames(30).slice(5, 25), (f) => f.levelMdb[5]!)
    })
    const mean = levels.reduce((sum, level) => sum + level, 0) / levels.length
    const s = Math.sqrt(levels.reduce((sum, level) => sum + (level - mean) ** 2, 0) / (levels.length - 1))
    expect(s).toBeGreaterThan(1.6)
    expect(s).toBeLessThan(2.4)
  })

  it('settles after the thump of plugging in, within 2 to 12 s', () => {
    const { source, frames } = makeBench()
    source.simulate({ kind: 'plug' })
    const levels = frames(1300).map((step) => step.frame.jackMdb)
    const floor = meanLevelDb(frames(100), (f) => f.jackMdb) * 1000
    expect(levels[0]).toBeGreaterThan(-20_000)
    expect(levels[150]).toBeGreaterThan(floor + 6000)
    const settled = levels.findIndex((_, i) => levels.slice(i, i + 50).every((level) => level < floor + 2500))
    expect(settled * 10).toBeGreaterThan(2000)
    expect(settled * 10).toBeLessThan(12_000)
  })

  it('shows plug, switch and supply current, plugged and unplugged', () => {
    const { source, frames } = makeBench()
    const unplugged = frames(50).at(-1)!.frame
    expect(unplugged).toMatchObject({ plugged: false, ringSleeveClosed: false, tipClosed: null })
    expect(Math.abs(unplugged.currentUa!)).toBeLessThanOrEqual(1)
    source.simulate({ kind: 'plug' })
    const plugged = frames(50).at(-1)!.frame
    expect(plugged).toMatchObject({ plugged: true, ringSleeveClosed: true, tipClosed: true })
    expect(plugged.currentUa).toBeGreaterThan(900)
    expect(plugged.currentUa).toBeLessThan(1500)
    source.simulate({ kind: 'unplug' })
    expect(frames(1)[0]!.frame.plugged).toBe(false)
  })

  it('lets a weak battery sag under load, and clip the attack', () => {
    const { source, frames } = makeBench()
    place(source, [{ fault: 'lowBattery', severity: 2 }])
    frames(10)
    source.simulate({ kind: 'plug' })
    const volts = frames(1500).map((step) => step.frame.batteryMv!)
    expect(volts.at(-1)!).toBeLessThan(volts[5]! - 10)
    source.simulate({ kind: 'pluck', stringNo: 3 })
    const clipped = frames(30).map((step) => step.frame.clipped)
    expect(Math.max(...clipped.slice(0, 3))).toBeGreaterThan(0)
    expect(Math.max(...clipped.slice(10))).toBe(0)
  })

  it('never clips with a good battery', () => {
    const { source, frames } = pluggedBench({ scatterDb: 2 })
    for (let i = 0; i < 60; i++) {
      source.simulate({ kind: 'damp' })
      frames(20)
      source.simulate({ kind: 'pluck', stringNo: 1 + (i % 6) })
      expect(frames(30).every((step) => step.frame.clipped === 0)).toBe(true)
    }
  })
})

describe('events of a modelled source', () => {
  it('tell each pitch 200 to 300 ms after its pluck, a cent or so off, at the loudest element', () => {
    const { source, frames } = pluggedBench()
    for (const stringNo of [1, 2, 3, 4, 5, 6]) {
      source.simulate({ kind: 'damp' })
      frames(60)
      source.simulate({ kind: 'pluck', stringNo })
      const steps = frames(60)
      const pitches = eventsOf(steps).filter((event) => event.kind === 'pitch')
      expect(pitches).toHaveLength(1)
      const pitch = pitches[0]!
      const onsetFrame = pitch.frame - steps.findIndex((step) => step.events.includes(pitch))
      expect(pitch.frame - onsetFrame).toBeGreaterThanOrEqual(20)
      expect(pitch.frame - onsetFrame).toBeLessThanOrEqual(30)
      expect(pitch.durationTenthMs).toBeGreaterThanOrEqual(600)
      expect(pitch.startTenthMs + pitch.durationTenthMs).toBeLessThanOrEqual((pitch.frame + 1) * 100)
      expect(
        Math.abs(1200 * Math.log2(pitch.milliHz / 1000 / buildOrder().expectedHz[stringNo - 1]![0]!)),
      ).toBeLessThan(5)
      expect(pitch.channel).toBe(stringNo)
      expect(pitch.confidencePercent).toBeGreaterThan(90)
    }
  })

  it('tell two pitches of a strum', () => {
    const { source, frames } = pluggedBench()
    source.simulate({ kind: 'pluck', stringNo: 2 })
    source.simulate({ kind: 'pluck', stringNo: 5 })
    const pitches = eventsOf(frames(40)).filter((event) => event.kind === 'pitch')
    expect(pitches.map((pitch) => Math.round(pitch.milliHz / 1000)).sort((a, b) => a - b)).toEqual([110, 247])
  })

  it('tell the jack as channel of a one-channel bench, and nothing of a dead instrument', () => {
    const { source, frames } = pluggedBench({ channelKind: 'one' })
    source.simulate({ kind: 'pluck', stringNo: 4 })
    expect(eventsOf(frames(40)).filter((event) => event.kind === 'pitch')).toMatchObject([{ channel: 0 }])
    place(source, [{ fault: 'noPower', severity: 1 }])
    source.simulate({ kind: 'plug' })
    frames(SETTLED_FRAMES)
    source.simulate({ kind: 'pluck', stringNo: 4 })
    expect(eventsOf(frames(40)).filter((event) => event.kind === 'pitch')).toEqual([])
  })

  it('tell a string with a dead element by the neighbour that hears it', () => {
    const { source, frames } = pluggedBench()
    place(source, [{ fault: 'elementOpen', severity: 1, stringNo: 3 }])
    source.simulate({ kind: 'plug' })
    frames(SETTLED_FRAMES)
    source.simulate({ kind: 'pluck', stringNo: 3 })
    const pitch = eventsOf(frames(40)).find((event) => event.kind === 'pitch')!
    expect(Math.round(pitch.milliHz / 1000)).toBe(196)
    expect(pitch.channel).not.toBe(3)
  })

  it('tell the hum of a quiet stretch as long as the order asks for, near the truth', () => {
    const { source, frames } = pluggedBench({ faults: [{ fault: 'shieldOpen', severity: 1 }] })
    const hums = eventsOf(frames(400)).filter((event) => event.kind === 'hum' && event.channel === 0)
    expect(hums.length).toBeGreaterThan(3)
    for (const hum of hums) {
      if (hum.kind !== 'hum') continue
      expect(hum.durationTenthMs).toBe(50_000)
      expect(hum.levelMdb / 1000).toBeCloseTo(truthOf(source.parts).humDb[6]!, 0)
    }
  })

  it('tell no hum while a string rings', () => {
    const { source, frames } = pluggedBench()
    source.simulate({ kind: 'pluck', stringNo: 6 })
    expect(eventsOf(frames(300)).filter((event) => event.kind === 'hum')).toEqual([])
  })

  it('tell contact resistances at rest near the truth, an open tip as the highest', () => {
    const { source, frames } = makeBench({ faults: [{ fault: 'tipOpen', severity: 1 }] })
    source.simulate({ kind: 'plug' })
    const contacts = eventsOf(frames(400)).filter((event) => event.kind === 'contact')
    const read = Object.fromEntries(contacts.map((event) => [event.pole, event.microOhm / 1e6]))
    expect(read.tip).toBe(2000)
    expect(Math.abs(read.ring! - source.parts.jack.contactOhm.ring)).toBeLessThan(0.002)
    expect(Math.abs(read.sleeve! - source.parts.jack.contactOhm.sleeve)).toBeLessThan(0.002)
  })

  it('tell the disturbances of a worn jack during a wiggle only, and none of a sound one', () => {
    const disturbances = (faults: Fault[]) => {
      const { source, frames } = pluggedBench({ faults })
      const count = (steps: SourceStep[]) =>
        eventsOf(steps).filter((event) => event.kind === 'disturbance').length
      const atRest = count(frames(500))
      source.simulate({ kind: 'wiggle' })
      return { atRest, moved: count(frames(710)), after: count(frames(300)) }
    }
    expect(disturbances([])).toEqual({ atRest: 0, moved: 0, after: 0 })
    const worn = disturbances([{ fault: 'wornJack', severity: 1 }])
    expect(worn).toMatchObject({ atRest: 0, after: 0 })
    expect(worn.moved).toBeGreaterThan(4)
  })

  it('raise single frames of a crackling instrument far above its floor', () => {
    const { frames } = pluggedBench({ faults: [{ fault: 'crackle', severity: 1, stringNo: 2 }] })
    const levels = frames(2000).map((step) => step.frame.levelMdb[1]!)
    const loud = levels.filter((level) => level > -80_000).length
    expect(loud).toBeGreaterThan(10)
    expect(loud).toBeLessThan(400)
  })

  it('hold a pressed pedal once', () => {
    const { source, frames } = makeBench()
    source.simulate({ kind: 'pedal' })
    expect(eventsOf(frames(20)).filter((event) => event.kind === 'pedal')).toHaveLength(1)
  })
})

describe('verifySelf()', () => {
  it.each(['six', 'one'] as const)(
    'measures every channel of the bench (%s) within a tenth of a dB',
    (channelKind) => {
      const source = makeModelledSource({ seed: 4, channelKind, circuit: 'buffered' })
      const verify = BenchVerify.parse(source.verifySelf())
      expect(new Set(verify.tones.map((tone) => tone.channel)).size).toBe(channelKind === 'six' ? 7 : 1)
      for (const tone of verify.tones) expect(Math.abs(tone.measuredMdb - tone.appliedMdb)).toBeLessThan(100)
      for (const quiet of verify.quiet) expect(quiet.flatMdb).toBeLessThan(-110_000)
      for (const { appliedMicroOhm, measuredMicroOhm } of verify.resistances) {
        if (appliedMicroOhm === null) expect(measuredMicroOhm).toBeNull()
        else expect(Math.abs(measuredMicroOhm! - appliedMicroOhm)).toBeLessThan(10_000)
      }
    },
  )

  it('sees the loop of the bench with the quiet source', () => {
    const source = makeModelledSource({
      seed: 4,
      channelKind: 'six',
      circuit: 'buffered',
      faults: [{ fault: 'benchHum', severity: 1 }],
    })
    for (const quiet of source.verifySelf().quiet) expect(quiet.flatMdb).toBeGreaterThan(-70_000)
  })
})

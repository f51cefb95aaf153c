import type { BenchEvent, Frame, FrameMs } from '../../src/shared/contract/frames.ts'
import type { SourceStep } from '../sources/source.ts'
import { benchLoop, mdbOfPower, microOhmRead, SAMPLE_RATE_HZ } from './benchInput.ts'
import type { BenchInput } from './benchInput.ts'
import { compileCircuit, JACK, POINTS } from './circuit.ts'
import type { Tuning } from './circuit.ts'
import { clipSine } from './clipSine.ts'
import { makeHumReports } from './humReports.ts'
import { POLES } from './instrument.ts'
import type { InstrumentParts } from './instrument.ts'
import { clipPeakV, makeJackModel } from './jackState.ts'
import type { JackFrame } from './jackState.ts'
import { chiSquareRatio } from './noisePhysics.ts'
import type { BandNoise } from './noisePhysics.ts'
import { CREST } from './partials.ts'
import { makePitchReports } from './pitchReports.ts'
import type { Random } from './random.ts'
import { advanceVoice, dampVoice, makeVoice, powerThrough } from './voices.ts'
import type { Voice } from './voices.ts'

/** Contact resistances are read so long after plugging in, s. */
const REST_READING_S = 2.5
/** Noise of moving the lead, V rms; common practice, no source. */
const HANDLING_V = 25e-6
const ATTACK_SCATTER_DB = 1.5

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
  random: { noise: Random; pluck: Random; contact: Random; report: Random }
}

/** A modelled instrument lying on a modelled bench, moved on by one frame at a time. */
export interface ModelledBench {
  plug(): void
  unplug(): void
  damp(): void
  pluck(stringNo: number): void
  wiggle(): void
  pedal(): void
  /** read the contacts at rest once more */
  readContacts(): void
  restart(tuning: Tuning, noiseStretchMs: number): void
  step(frameNo: number): SourceStep
  isPlugged(): boolean
  /** the last pluck was to be seen at some point of measurement */
  lastPluckSeen(): boolean
}

export function makeModelledBench(options: ModelledBenchOptions): ModelledBench {
  const { parts, bench, frameMs, mainsHz, random, reads } = options
  const frameS = frameMs / 1000
  const firstPoint = bench.channelKind === 'six' ? 0 : JACK
  const jack = makeJackModel(parts, frameS, random.contact)
  const loop = benchLoop(parts.benchLoopV, mainsHz)
  let tuning = options.tuning
  let circuit = compileCircuit(parts, tuning, mainsHz, frameS)
  let live = circuit.noise.map((noise) => joinedNoise(noise, bench.noise))
  const voices: (Voice | null)[] = [null, null, null, null, null, null]
  const waitingPlucks: number[] = []
  const flat = new Float64Array(POINTS)
  const a = new Float64Array(POINTS)
  const voicePower = new Float64Array(POINTS)
  let pedalPressed = false
  let contactsWanted = false
  let pluckSeen = false
  let burstFrames = 0
  let burstPower = 0
  const pitches = makePitchReports(bench.channelKind, frameMs, random.report)
  const hums = makeHumReports(bench.channelKind, frameMs, mainsHz, random.report)
  hums.restart(options.noiseStretchMs)

  function startPlucks(frameNo: number): void {
    for (const stringNo of waitingPlucks) {
      const into = Math.floor(random.pluck.uniform() * frameMs * 10) / (frameMs * 10)
      const force = {
        power: Math.pow(10, (options.scatterDb * random.pluck.normalWithin(3)) / 10),
        attackPower: Math.pow(10, (ATTACK_SCATTER_DB * random.pluck.normal()) / 10),
      }
      voices[stringNo - 1] = makeVoice(parts.strings[stringNo - 1]!, force, frameS, into)
      pitches.expect(stringNo, frameNo, Math.round((frameNo + into) * frameMs * 10))
      pluckSeen = false
    }
    waitingPlucks.length = 0
  }

  function addVoices(): void {
    for (let s = 0; s < 6; s++) {
      const voice = voices[s]
      if (!voice) continue
      const paths = circuit.strings[s]!
      for (let point = firstPoint; point < POINTS; point++) {
        flat[point]! += powerThrough(voice, paths.flat[point]!) + voice.attack * paths.attack[point]!
        a[point]! += powerThrough(voice, paths.a[point]!) + voice.attack * paths.attackA[point]!
      }
    }
  }

  function moveVoices(): void {
    for (let s = 0; s < 6; s++) {
      const voice = voices[s]
      if (voice && !advanceVoice(voice)) voices[s] = null
    }
  }

  function addCrackle(): void {
    const { crackle } = parts
    if (!(crackle.perSecond > 0)) return
    if (burstFrames === 0 && random.noise.uniform() < crackle.perSecond * frameS) {
      burstFrames = 1 + Math.floor(random.noise.uniform() * 2)
      burstPower = crackle.burstC ** 2 * random.noise.exponential(1)
    }
    if (burstFrames === 0) return
    burstFrames -= 1
    for (let point = firstPoint; point < POINTS; point++) {
      flat[point]! += burstPower * circuit.chargeGain[point]!
      a[point]! += 0.6 * burstPower * circuit.chargeGain[point]!
    }
  }

  function clipAll(supplyV: number): number {
    const peakV = clipPeakV(parts, supplyV)
    let worst = 0
    for (let point = firstPoint; point < POINTS; point++) {
      const { power, clippedShare } = clipSine(flat[point]!, peakV, CREST)
      if (clippedShare === 0) continue
      a[point]! *= power / flat[point]!
      flat[point] = power
      worst = Math.max(worst, clippedShare)
    }
    return Math.ceil(worst * SAMPLE_RATE_HZ * frameS)
  }

  /** What the instrument gives, before the bench's own noise; returns the clipped samples. */
  function addInstrument(state: JackFrame, frameNo: number): number {
    if (!state.powered) return 0
    addVoices()
    for (let point = firstPoint; point < POINTS; point++) voicePower[point] = flat[point]!
    addCrackle()
    const clipped = clipAll(state.supplyV)
    const swing = mainsSwing(frameNo, frameS, mainsHz)
    for (let point = firstPoint; point < POINTS; point++) {
      const mains = circuit.mains[point]!
      flat[point]! += mains.flat + mains.fundamental * swing + state.thumpPower
      a[point]! += mains.a + mains.fundamentalA * swing + 0.001 * state.thumpPower
    }
    return clipped
  }

  function addBench(state: JackFrame, frameNo: number): void {
    const swing = mainsSwing(frameNo, frameS, mainsHz)
    const reaches = 1 - state.signalLost
    for (let point = firstPoint; point < POINTS; point++) {
      let noise = state.powered ? live[point]! : bench.noise
      if (point === JACK) {
        flat[point]! *= reaches
        a[point]! *= reaches
        voicePower[point]! *= reaches
        if (reaches < 0.5) noise = bench.noise
        if (state.wiggling) {
          const handling = HANDLING_V ** 2 * random.noise.exponential(1)
          flat[point]! += handling
          a[point]! += 0.3 * handling
        }
      }
      const draw = random.noise.normal()
      const drawA = 0.8 * draw + 0.6 * random.noise.normal()
      flat[point]! +=
        noise.flatPower * chiSquareRatio(noise.flatDof, draw) + loop.flat + loop.fundamental * swing
      a[point]! += noise.aPower * chiSquareRatio(noise.aDof, drawA) + loop.a + loop.fundamentalA * swing
      flat[point]! *= bench.gain[point]!
      a[point]! *= bench.gain[point]!
    }
  }

  function readAtRest(state: JackFrame, frameNo: number, events: BenchEvent[]): void {
    if (state.plugged && state.pluggedFrames === Math.round(REST_READING_S / frameS)) contactsWanted = true
    if (!contactsWanted || !state.plugged) return
    contactsWanted = false
    const place = { frame: frameNo, startTenthMs: frameNo * frameMs * 10, durationTenthMs: frameMs * 10 }
    if (reads.contacts) {
      for (const pole of POLES) {
        const open = pole === 'tip' && parts.jack.tipOpen
        const ohm = open ? Number.POSITIVE_INFINITY : parts.jack.contactOhm[pole]
        events.push({ kind: 'contact', ...place, pole, microOhm: microOhmRead(bench, ohm, random.report) })
      }
    }
    if (reads.insulation) {
      const kiloOhm = Math.round((parts.jack.insulationOhm / 1000) * (1 + 0.01 * random.report.normal()))
      events.push({ kind: 'insulation', ...place, testMillivolt: 5000, kiloOhm })
    }
  }

  function frameOf(state: JackFrame, clipped: number): Frame {
    const levels: number[] = []
    const levelsA: number[] = []
    if (firstPoint === 0) {
      for (let point = 0; point < JACK; point++) {
        levels.push(mdbOfPower(flat[point]!))
        levelsA.push(mdbOfPower(a[point]!))
      }
    } else {
      levels.push(mdbOfPower(flat[JACK]!))
      levelsA.push(mdbOfPower(a[JACK]!))
    }
    return {
      levelMdb: levels,
      levelAMdb: levelsA,
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

  function report(state: JackFrame, frameNo: number, events: BenchEvent[]): void {
    const noise = state.powered ? live : null
    if (reads.pitch) {
      pitches.report(
        frameNo,
        events,
        (stringNo, point) => {
          const voice = voices[stringNo - 1]
          if (!voice || !state.powered) return 0
          const lost = point === JACK ? state.signalLost : 0
          return powerThrough(voice, circuit.strings[stringNo - 1]!.flat[point]!) * (1 - lost)
        },
        (point) => (noise?.[point] ?? bench.noise).flatPower,
        tuning,
      )
    }
    if (reads.hum) {
      const still = state.plugged && !state.wiggling && isQuiet(state)
      hums.report(frameNo, events, still, (point) => {
        const mains =
          state.powered && !(point === JACK && state.signalLost >= 0.5) ? circuit.mains[point]!.hum : 0
        return {
          power: (mains + loop.hum) * bench.gain[point]!,
          density: (noise?.[point] ?? bench.noise).flatPower / 20_000,
        }
      })
    }
  }

  function isQuiet(state: JackFrame): boolean {
    if (!state.powered) return true
    for (let point = firstPoint; point < POINTS; point++) {
      if (voicePower[point]! + state.thumpPower > live[point]!.flatPower) return false
    }
    return true
  }

  return {
    plug: () => jack.plug(),
    unplug: () => jack.unplug(),
    damp() {
      waitingPlucks.length = 0
      for (const voice of voices) if (voice) dampVoice(voice, frameS)
    },
    pluck(stringNo) {
      waitingPlucks.push(stringNo)
    },
    wiggle: () => jack.wiggle(),
    pedal() {
      pedalPressed = true
    },
    readContacts() {
      contactsWanted = true
    },
    restart(newTuning, noiseStretchMs) {
      tuning = newTuning
      circuit = compileCircuit(parts, tuning, mainsHz, frameS)
      live = circuit.noise.map((noise) => joinedNoise(noise, bench.noise))
      jack.restart()
      pitches.restart()
      hums.restart(noiseStretchMs)
      waitingPlucks.length = 0
      pedalPressed = false
    },
    isPlugged: () => jack.isPlugged(),
    lastPluckSeen: () => pluckSeen,
    step(frameNo) {
      const events: BenchEvent[] = []
      startPlucks(frameNo)
      const state = jack.step(frameNo, events)
      flat.fill(0)
      a.fill(0)
      voicePower.fill(0)
      const clipped = addInstrument(state, frameNo)
      addBench(state, frameNo)
      for (let point = firstPoint; point < POINTS; point++) {
        const noise = state.powered ? live[point]! : bench.noise
        if (voicePower[point]! > 10 * noise.flatPower) pluckSeen = true
      }
      readAtRest(state, frameNo, events)
      report(state, frameNo, events)
      if (pedalPressed) {
        pedalPressed = false
        events.push({
          kind: 'pedal',
          frame: frameNo,
          startTenthMs: frameNo * frameMs * 10,
          durationTenthMs: 1000,
        })
      }
      const frame = frameOf(state, clipped)
      moveVoices()
      return { frame, events }
    },
  }
}

/** Two independent noises: powers add, degrees of freedom by Welch and Satterthwaite. */
function joinedNoise(one: BandNoise, other: BandNoise): BandNoise {
  const flatPower = one.flatPower + other.flatPower
  const aPower = one.aPower + other.aPower
  return {
    flatPower,
    aPower,
    flatDof: flatPower ** 2 / (one.flatPower ** 2 / one.flatDof + other.flatPower ** 2 / other.flatDof),
    aDof: aPower ** 2 / (one.aPower ** 2 / one.aDof + other.aPower ** 2 / other.aDof),
  }
}

/** Mean of 2 sin^2 over a frame, less 1: how far a frame's share of the mains fundamental is from its mean. */
function mainsSwing(frameNo: number, frameS: number, mainsHz: number): number {
  const turn = 2 * Math.PI * mainsHz * frameS
  return -(Math.sin(turn) / turn) * Math.cos((2 * frameNo + 1) * turn)
}

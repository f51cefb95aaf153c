import type { BenchInput } from './benchInput.ts'
import { benchLoop, SAMPLE_RATE_HZ } from './benchInput.ts'
import { compileCircuit, JACK, POINTS } from './circuit.ts'
import type { CompiledCircuit, MainsPower, Tuning } from './circuit.ts'
import { clipSine } from './clipSine.ts'
import type { InstrumentParts } from './instrument.ts'
import { clipPeakV } from './jackState.ts'
import type { JackFrame } from './jackState.ts'
import { chiSquareRatio } from './noisePhysics.ts'
import type { BandNoise } from './noisePhysics.ts'
import { CREST } from './partials.ts'
import type { Random } from './random.ts'
import { advanceVoice, dampVoice, makeVoice, powerThrough } from './voices.ts'
import type { PluckForce, Voice } from './voices.ts'

/** Noise of moving the lead, V rms; common practice, no source. */
const HANDLING_V = 25e-6
/** Share of a broadband burst, of handling and of a thump that A-weighting leaves. */
const BURST_A = 0.6
const HANDLING_A = 0.3
const THUMP_A = 0.001
/** A string is to be seen at a point when it stands so far above the noise there: 10 dB. */
const SEEN_RATIO = 10
/** Correlation between the chance in a frame's flat and A-weighted noise: they share most of their band. */
const SHARED_CHANCE = 0.8
const OWN_CHANCE = 0.6

/** Powers at every point of measurement, frame by frame: strings, noise, hum, bursts, clipping and the bench. */
export class SignalPath {
  /** mean square of the present frame at channel 1..6 and the jack, V^2 */
  readonly flat = new Float64Array(POINTS)
  readonly a = new Float64Array(POINTS)
  /** of that the strings alone */
  readonly voicePower = new Float64Array(POINTS)
  readonly firstPoint: number
  private readonly parts: InstrumentParts
  private readonly bench: BenchInput
  private readonly frameS: number
  private readonly mainsHz: number
  private readonly random: Random
  private readonly loop: MainsPower
  private readonly voices: (Voice | null)[] = [null, null, null, null, null, null]
  private circuit: CompiledCircuit
  private live: BandNoise[]
  private burstFrames = 0
  private burstPower = 0

  constructor(
    parts: InstrumentParts,
    bench: BenchInput,
    tuning: Tuning,
    frameS: number,
    mainsHz: number,
    random: Random,
  ) {
    this.parts = parts
    this.bench = bench
    this.frameS = frameS
    this.mainsHz = mainsHz
    this.random = random
    this.firstPoint = bench.channelKind === 'six' ? 0 : JACK
    this.loop = benchLoop(parts.benchLoopV, mainsHz)
    this.circuit = compileCircuit(parts, tuning, mainsHz, frameS)
    this.live = this.circuit.noise.map((noise) => joinedNoise(noise, bench.noise))
  }

  retune(tuning: Tuning): void {
    this.circuit = compileCircuit(this.parts, tuning, this.mainsHz, this.frameS)
    this.live = this.circuit.noise.map((noise) => joinedNoise(noise, this.bench.noise))
  }

  pluck(stringNo: number, force: PluckForce, intoFrame: number): void {
    this.voices[stringNo - 1] = makeVoice(this.parts.strings[stringNo - 1]!, force, this.frameS, intoFrame)
  }

  damp(): void {
    for (const voice of this.voices) if (voice) dampVoice(voice, this.frameS)
  }

  /** Works out one frame; returns its clipped samples. */
  measure(state: JackFrame, frameNo: number): number {
    this.flat.fill(0)
    this.a.fill(0)
    this.voicePower.fill(0)
    const swing = mainsSwing(frameNo, this.frameS, this.mainsHz)
    const clipped = state.powered ? this.addInstrument(state, swing) : 0
    this.addBench(state, swing)
    return clipped
  }

  /** The strings move on to the next frame. */
  advance(): void {
    for (let s = 0; s < 6; s++) {
      const voice = this.voices[s]
      if (voice && !advanceVoice(voice)) this.voices[s] = null
    }
  }

  /** Noise without hum at a point: the instrument's with the bench's, or the bench's alone. */
  noiseAt(point: number, state: JackFrame): BandNoise {
    return reachesBench(point, state) ? this.live[point]! : this.bench.noise
  }

  /** Mains lines up to 1 kHz at a point, as the bench reads them. */
  humAt(point: number, state: JackFrame): number {
    const mains = reachesBench(point, state) ? this.circuit.mains[point]!.hum : 0
    return (mains + this.loop.hum) * this.bench.gain[point]!
  }

  stringPowerAt(stringNo: number, point: number, state: JackFrame): number {
    const voice = this.voices[stringNo - 1]
    if (!voice || !state.powered) return 0
    const reaches = point === JACK ? 1 - state.signalLost : 1
    return powerThrough(voice, this.circuit.strings[stringNo - 1]!.flat[point]!) * reaches
  }

  /** A string stands out somewhere on the bench. */
  stringSeen(state: JackFrame): boolean {
    for (let point = this.firstPoint; point < POINTS; point++) {
      if (this.voicePower[point]! > SEEN_RATIO * this.noiseAt(point, state).flatPower) return true
    }
    return false
  }

  /** Neither a string nor the thump of plugging in stands out of the noise. */
  isQuiet(state: JackFrame): boolean {
    if (!state.powered) return true
    for (let point = this.firstPoint; point < POINTS; point++) {
      if (this.voicePower[point]! + state.thumpPower > this.live[point]!.flatPower) return false
    }
    return true
  }

  private addInstrument(state: JackFrame, swing: number): number {
    const { flat, a, firstPoint } = this
    this.addVoices()
    for (let point = firstPoint; point < POINTS; point++) this.voicePower[point] = flat[point]!
    this.addCrackle()
    const clipped = this.clip(state.supplyV)
    for (let point = firstPoint; point < POINTS; point++) {
      const mains = this.circuit.mains[point]!
      flat[point]! += mains.flat + mains.fundamental * swing + state.thumpPower
      a[point]! += mains.a + mains.fundamentalA * swing + THUMP_A * state.thumpPower
    }
    return clipped
  }

  private addVoices(): void {
    const { flat, a } = this
    for (let s = 0; s < 6; s++) {
      const voice = this.voices[s]
      if (!voice) continue
      const paths = this.circuit.strings[s]!
      for (let point = this.firstPoint; point < POINTS; point++) {
        flat[point]! += powerThrough(voice, paths.flat[point]!) + voice.attack * paths.attack[point]!
        a[point]! += powerThrough(voice, paths.a[point]!) + voice.attack * paths.attackA[point]!
      }
    }
  }

  private addCrackle(): void {
    const { crackle } = this.parts
    if (!(crackle.perSecond > 0)) return
    if (this.burstFrames === 0 && this.random.uniform() < crackle.perSecond * this.frameS) {
      this.burstFrames = 1 + Math.floor(this.random.uniform() * 2)
      this.burstPower = crackle.burstC ** 2 * this.random.exponential(1)
    }
    if (this.burstFrames === 0) return
    this.burstFrames -= 1
    for (let point = this.firstPoint; point < POINTS; point++) {
      const power = this.burstPower * this.circuit.chargeGain[point]!
      this.flat[point]! += power
      this.a[point]! += BURST_A * power
    }
  }

  private clip(supplyV: number): number {
    const peakV = clipPeakV(this.parts, supplyV)
    let worst = 0
    for (let point = this.firstPoint; point < POINTS; point++) {
      const { power, clippedShare } = clipSine(this.flat[point]!, peakV, CREST)
      if (clippedShare === 0) continue
      this.a[point]! *= power / this.flat[point]!
      this.flat[point] = power
      worst = Math.max(worst, clippedShare)
    }
    return Math.ceil(worst * SAMPLE_RATE_HZ * this.frameS)
  }

  private addBench(state: JackFrame, swing: number): void {
    const { flat, a, bench, loop, random } = this
    this.passJack(state)
    for (let point = this.firstPoint; point < POINTS; point++) {
      const noise = this.noiseAt(point, state)
      const chance = random.normal()
      const chanceA = SHARED_CHANCE * chance + OWN_CHANCE * random.normal()
      flat[point]! +=
        noise.flatPower * chiSquareRatio(noise.flatDof, chance) + loop.flat + loop.fundamental * swing
      a[point]! += noise.aPower * chiSquareRatio(noise.aDof, chanceA) + loop.a + loop.fundamentalA * swing
      flat[point]! *= bench.gain[point]!
      a[point]! *= bench.gain[point]!
    }
  }

  /** What the contacts let through, and what moving the plug adds. */
  private passJack(state: JackFrame): void {
    const reaches = 1 - state.signalLost
    this.flat[JACK]! *= reaches
    this.a[JACK]! *= reaches
    this.voicePower[JACK]! *= reaches
    if (!state.wiggling) return
    const handling = HANDLING_V ** 2 * this.random.exponential(1)
    this.flat[JACK]! += handling
    this.a[JACK]! += HANDLING_A * handling
  }
}

function reachesBench(point: number, state: JackFrame): boolean {
  return state.powered && !(point === JACK && state.signalLost > 0.5)
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

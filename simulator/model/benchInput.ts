import type { BenchVerify, ChannelKind } from '../../src/shared/contract/frames.ts'
import { NOT_MEASURED_MDB, SILENCE_MDB } from '../../src/shared/contract/quantities.ts'
import { addHarmonic, emptyMains, JACK, POINTS } from './circuit.ts'
import type { MainsPower } from './circuit.ts'
import { bandNoise, chiSquareRatio } from './noisePhysics.ts'
import type { BandNoise } from './noisePhysics.ts'
import { ratioOfDb } from './instrument.ts'
import { makeRandom } from './random.ts'
import type { Random } from './random.ts'

/** The bench's own errors and noise: what every reading goes through. */
export interface BenchInput {
  channelKind: ChannelKind
  /** power gain of each input against a perfect one */
  gain: number[]
  noise: BandNoise
  /** error of the resistance and current measurements, ratios */
  ohmRatio: number
  ohmOffset: number
  currentRatio: number
}

/** Input noise of the bench: 14 nV per root Hz, 2 uV or -114 dBV in the band. */
const BENCH_NOISE_V = 14e-9
/** Samples a second that a frame's clipped count is told of. */
export const SAMPLE_RATE_HZ = 48_000

export function makeBenchInput(seed: number, channelKind: ChannelKind, frameS: number): BenchInput {
  const random = makeRandom(seed, 'bench input')
  return {
    channelKind,
    gain: Array.from({ length: POINTS }, () => ratioOfDb(0.03 * random.normalWithin(2.5)) ** 2),
    noise: bandNoise(() => BENCH_NOISE_V ** 2, frameS),
    ohmRatio: 1 + 0.002 * random.normalWithin(2.5),
    ohmOffset: 0.0002 * random.normalWithin(2.5),
    currentRatio: 1 + 0.002 * random.normalWithin(2.5),
  }
}

/** Power in V^2 as a level in thousandths of a dB re 1 V. */
export function mdbOfPower(power: number): number {
  if (!(power > 0)) return SILENCE_MDB
  const mdb = Math.round(10_000 * Math.log10(power))
  return mdb < -300_000 ? SILENCE_MDB : Math.min(100_000, mdb)
}

export const NOTHING_MDB = NOT_MEASURED_MDB

/** Hum that a loop through the bench puts at every input alike. */
export function benchLoop(loopV: readonly number[], mainsHz: number): MainsPower {
  const mains = emptyMains()
  loopV.forEach((rmsV, i) => addHarmonic(mains, mainsHz * (i + 1), i === 0, rmsV))
  return mains
}

/** Verification reads half a second at a time; the tones come through a known capacitor. */
const VERIFY_S = 0.5
const TONE_MDB = [-20_000, -40_000]
const STANDARD_MICRO_OHM = [0, 100_000, 1_000_000]
const STANDARD_UA = [0, 1000]

/** What the bench reads at the check standard: two tones, a quiet source, resistances and open, a current. */
export function measureCheckStandard(
  bench: BenchInput,
  id: string,
  loop: MainsPower,
  random: Random,
): BenchVerify {
  const channels = bench.channelKind === 'six' ? [1, 2, 3, 4, 5, 6, 0] : [0]
  const gainOf = (channel: number): number => bench.gain[channel === 0 ? JACK : channel - 1]!
  const dof = bench.noise.flatDof * 50
  const quietPower = (): number => bench.noise.flatPower * chiSquareRatio(dof, random.normal()) + loop.flat
  return {
    id,
    checkStandard: 'modelled check standard CS-1',
    tones: channels.flatMap((channel) =>
      TONE_MDB.map((appliedMdb) => ({
        channel,
        appliedMdb,
        measuredMdb: mdbOfPower(Math.pow(10, appliedMdb / 10_000) * gainOf(channel) + quietPower()),
      })),
    ),
    quiet: channels.map((channel) => ({
      channel,
      flatMdb: mdbOfPower(quietPower() * gainOf(channel)),
      aMdb: mdbOfPower(
        (bench.noise.aPower * chiSquareRatio(dof * VERIFY_S, random.normal()) + loop.a) * gainOf(channel),
      ),
    })),
    resistances: [
      ...STANDARD_MICRO_OHM.map((appliedMicroOhm) => ({
        appliedMicroOhm,
        measuredMicroOhm: microOhmRead(bench, appliedMicroOhm / 1e6, random),
      })),
      { appliedMicroOhm: null, measuredMicroOhm: null },
    ],
    currents: STANDARD_UA.map((appliedUa) => ({
      appliedUa,
      measuredUa: Math.round(appliedUa * bench.currentRatio + 0.3 * random.normal()),
    })),
  }
}

/** Four-wire reading of a resistance, in millionths of an ohm. */
export function microOhmRead(bench: BenchInput, resistanceOhm: number, random: Random): number {
  const readOhm = resistanceOhm * bench.ohmRatio + bench.ohmOffset + 0.0001 * random.normal()
  return Math.max(0, Math.min(2_000_000_000, Math.round(readOhm * 1e6)))
}

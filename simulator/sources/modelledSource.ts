import { randomUUID } from 'node:crypto'
import type { BenchVerify, ChannelKind, FrameMs } from '../../src/shared/contract/frames.ts'
import type { Capability } from '../../src/shared/contract/rules.ts'
import type { Fault, SimulationCommand } from '../../src/shared/contract/simulation.ts'
import { applyFaults } from '../model/applyFault.ts'
import { makeAutomaticHand } from '../model/automaticHand.ts'
import type { HandAct } from '../model/automaticHand.ts'
import { benchLoop, makeBenchInput, measureCheckStandard } from '../model/benchInput.ts'
import { STANDARD_TUNING } from '../model/circuit.ts'
import type { Tuning } from '../model/circuit.ts'
import { makeInstrument } from '../model/instrument.ts'
import type { Circuit, InstrumentParts } from '../model/instrument.ts'
import { ModelledBench } from '../model/modelledBench.ts'
import { makeRandom } from '../model/random.ts'
import type { BenchSource } from './source.ts'

export interface ModelledSourceOptions {
  seed: number
  channelKind: ChannelKind
  /** until a run's model says otherwise */
  circuit: Circuit
  frameMs?: FrameMs
  mainsHz?: 50 | 60
  capabilities?: readonly Capability[]
  /** standard deviation of a pluck's force, dB */
  scatterDb?: number
  faults?: readonly Fault[]
  /** the automatic hand from the start, and how many times faster than a clock everything runs */
  hand?: boolean
  timeScale?: number
  realTime?: boolean
  makeId?: () => string
}

export interface ModelledSource extends BenchSource {
  simulate(command: SimulationCommand): void
  verifySelf(): BenchVerify
  /** the instrument that lies on the bench */
  readonly parts: InstrumentParts
}

/** Everything that an instrument on a fully fitted bench lets one measure. */
export const SIX_CHANNEL_CAPABILITIES: readonly Capability[] = [
  'sixLevels',
  'jackLevel',
  'noiseA',
  'hum',
  'pitch',
  'plugState',
  'tipContinuity',
  'disturbances',
  'contactResistance',
  'insulation',
  'current',
  'battery',
  'pedal',
]

/** The same from the output jack alone, without a clip on the jack's lugs. */
export const ONE_CHANNEL_CAPABILITIES: readonly Capability[] = SIX_CHANNEL_CAPABILITIES.filter(
  (capability) => !['sixLevels', 'contactResistance', 'insulation'].includes(capability),
)

const DEFAULT_SCATTER_DB = 0.8

/** Which instrument lies on the bench, whatever circuit the run's model has. */
interface PlaceWish {
  seed: number
  faults: readonly Fault[]
  scatterDb: number
}

export function makeModelledSource(options: ModelledSourceOptions): ModelledSource {
  const frameMs = options.frameMs ?? 10
  const mainsHz = options.mainsHz ?? 50
  const { channelKind } = options
  const capabilities =
    options.capabilities ?? (channelKind === 'six' ? SIX_CHANNEL_CAPABILITIES : ONE_CHANNEL_CAPABILITIES)
  const input = makeBenchInput(options.seed, channelKind, frameMs / 1000)
  const verifyRandom = makeRandom(options.seed, 'check standard')
  const makeId = options.makeId ?? randomUUID
  let tuning: Tuning = STANDARD_TUNING
  let noiseStretchMs = 5000
  let circuit = options.circuit
  let wish: PlaceWish = {
    seed: options.seed,
    faults: options.faults ?? [],
    scatterDb: options.scatterDb ?? DEFAULT_SCATTER_DB,
  }
  let placed = place(wish)
  let hand = makeAutomaticHand(options.seed, frameMs)
  let handOn = options.hand ?? false
  let timeScale = options.timeScale ?? 1
  let serverSeen = true

  function place({ seed, faults, scatterDb }: PlaceWish): { parts: InstrumentParts; bench: ModelledBench } {
    const parts = applyFaults(makeInstrument(seed, circuit), faults)
    const bench = new ModelledBench({
      parts,
      bench: input,
      tuning,
      frameMs,
      mainsHz,
      scatterDb,
      noiseStretchMs,
      reads: {
        contacts: capabilities.includes('contactResistance'),
        insulation: capabilities.includes('insulation'),
        hum: capabilities.includes('hum'),
        pitch: capabilities.includes('pitch'),
      },
      random: {
        noise: makeRandom(seed, 'noise'),
        pluck: makeRandom(seed, 'pluck'),
        contact: makeRandom(seed, 'contact'),
        report: makeRandom(seed, 'report'),
      },
    })
    return { parts, bench }
  }

  function act(each: HandAct): void {
    if (each.kind === 'pluck') placed.bench.pluck(each.stringNo)
    else placed.bench[each.kind]()
  }

  return {
    channelKind,
    frameMs,
    mainsHz,
    capabilities,
    algorithms: { source: 'modelled instrument 1', pitch: 'model 1', hum: 'model 1' },
    realTime: options.realTime ?? true,
    repeatable: false,
    get timeScale() {
      return timeScale
    },
    get parts() {
      return placed.parts
    },
    start(order) {
      tuning = STANDARD_TUNING.map((standardHz, s) => order.expectedHz[s]?.[0] ?? standardHz)
      noiseStretchMs = order.noiseStretchMs
      if (order.circuit !== undefined && order.circuit !== circuit) {
        circuit = order.circuit
        placed = place(wish)
      }
      placed.bench.restart(tuning, noiseStretchMs)
      hand.restart()
    },
    prompt(prompt) {
      hand.prompt(prompt)
      if (prompt.phase === 'jackRest') placed.bench.readContacts()
    },
    serverSeen(seen) {
      serverSeen = seen
    },
    next(frameNo) {
      if (handOn && serverSeen) {
        const sight = { plugged: placed.bench.isPlugged(), pluckSeen: placed.bench.lastPluckSeen() }
        hand.step(sight).forEach(act)
      }
      return placed.bench.step(frameNo)
    },
    finish() {
      hand.restart()
      if (!handOn) return
      placed.bench.damp()
      placed.bench.unplug()
    },
    verifySelf: () =>
      measureCheckStandard(input, makeId(), benchLoop(placed.parts.benchLoopV, mainsHz), verifyRandom),
    simulate(command) {
      switch (command.kind) {
        case 'place':
          wish = { seed: command.seed, faults: command.faults, scatterDb: command.scatterDb }
          placed = place(wish)
          hand = makeAutomaticHand(command.seed, frameMs)
          return
        case 'pluck':
          placed.bench.pluck(command.stringNo)
          return
        case 'automaticHand':
          handOn = command.on
          timeScale = command.on ? command.speed : 1
          return
        default:
          placed.bench[command.kind]()
      }
    },
  }
}

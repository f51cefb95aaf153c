import { describe, expect, it } from 'vitest'
import { BenchEvent, Frame } from '../../src/shared/contract/frames.ts'
import { MeasuredRun } from '../../src/shared/contract/measured.ts'
import { RULES } from '../../src/shared/contract/rules.ts'
import type { RuleId } from '../../src/shared/contract/rules.ts'
import type { RunSetup } from '../../src/shared/contract/runs.ts'
import { FaultId } from '../../src/shared/contract/simulation.ts'
import type { Circuit } from '../../simulator/model/instrument.ts'
import { applyFaults } from '../../simulator/model/applyFault.ts'
import { makeInstrument } from '../../simulator/model/instrument.ts'
import { truthOf } from '../../simulator/model/truthOf.ts'
import { runHeadless } from '../../simulator/headless.ts'
import { ONE_CHANNEL_CAPABILITIES, SIX_CHANNEL_CAPABILITIES } from '../../simulator/sources/modelledSource.ts'
import { buildSetup, sheetRule } from '../helpers/runSetup.ts'

const SEED = 3
const NOT_AT_THE_JACK: RuleId[] = [
  'contactTip',
  'contactRing',
  'contactSleeve',
  'insulation',
  'channelSeparation',
]
/** Mean over 400 modelled instruments, element levels of a buffered circuit, rounded. */
const PATTERN_DB = [-1.8, -0.6, 0.7, 0.4, 0.5, 0.8]

/** A sheet with every rule at its default limits, for a bench that measures all that it can. */
function setupFor(channelKind: 'six' | 'one', circuit: Circuit): RunSetup {
  const capabilities = channelKind === 'six' ? SIX_CHANNEL_CAPABILITIES : ONE_CHANNEL_CAPABILITIES
  const optional = channelKind === 'one' ? NOT_AT_THE_JACK : []
  return buildSetup({
    channelKind,
    capabilities: [...capabilities],
    floorDb: Array.from({ length: channelKind === 'six' ? 6 : 1 }, () => -114),
    model: { circuit },
    sheet: {
      noiseStretchMs: 5000,
      wiggleMs: 6000,
      referenceLevelDb: -18.8,
      patternDb: PATTERN_DB,
      patternUDb: 0.15,
      patternInstruments: 24,
      rules: (Object.keys(RULES) as RuleId[]).map((rule) =>
        sheetRule(rule, optional.includes(rule) ? { required: false } : {}),
      ),
    },
  })
}

function outsideOf(run: MeasuredRun): Set<RuleId> {
  return new Set(run.results.filter(({ result }) => result === 'outside').map(({ rule }) => rule))
}

describe('runHeadless()', () => {
  it.each([
    ['six', 'buffered'],
    ['six', 'parallel'],
    ['one', 'buffered'],
    ['one', 'parallel'],
  ] as const)(
    'brings sound instruments to a pass at human pace (%s channels, %s)',
    (channelKind, circuit) => {
      for (const seed of [1, 2, 3]) {
        const run = runHeadless({ seed, setup: setupFor(channelKind, circuit) })
        MeasuredRun.parse(run)
        expect(run.phase).toBe('done')
        expect(run.verdict).toBe('pass')
        const seconds = run.frames / 100
        expect(seconds).toBeGreaterThan(35)
        expect(seconds).toBeLessThan(65)
        for (const string of run.strings) expect(string.accepted).toBeGreaterThanOrEqual(3)
      }
    },
  )

  it('gives the same run to the last bit for the same options', () => {
    const options = { seed: 9, setup: setupFor('six', 'buffered') }
    expect(runHeadless(options)).toEqual(runHeadless(options))
    expect(runHeadless({ ...options, seed: 10 })).not.toEqual(runHeadless(options))
  })

  it('hands out a trace that the contract accepts', () => {
    let frames = 0
    const kinds = new Set<string>()
    const run = runHeadless({
      seed: 4,
      setup: setupFor('six', 'buffered'),
      onFrame: (frame, events) => {
        Frame.parse(frame)
        for (const event of events) {
          BenchEvent.parse(event)
          expect(event.frame).toBe(frames)
          kinds.add(event.kind)
        }
        frames += 1
      },
    })
    expect(frames).toBe(run.frames)
    expect([...kinds].sort()).toEqual(['contact', 'hum', 'insulation', 'pedal', 'pitch'])
  })

  it('reads the levels that the truth says, within three standard uncertainties of scatter', () => {
    const run = runHeadless({ seed: 12, setup: setupFor('six', 'buffered'), scatterDb: 0.5 })
    const truth = truthOf(makeInstrument(12, 'buffered'))
    run.strings.forEach((string, i) => {
      const limit = 3 * (0.5 / Math.sqrt(string.accepted)) + 0.3
      expect(Math.abs(string.level.value! - truth.levelDb[i]!)).toBeLessThan(limit)
    })
    expect(Math.abs(run.noise.hum.value! - truth.humDb[6]!)).toBeLessThan(1)
    expect(Math.abs(run.supply.pluggedMa! - truth.currentPluggedMa)).toBeLessThan(0.05)
    expect(Math.abs(run.jack.contactTipOhm! - truth.contactOhm.tip)).toBeLessThan(0.002)
  })
})

type Expected = { outside: RuleId[]; inside: RuleId[]; verdict: MeasuredRun['verdict'] }
const STRINGS: RuleId[] = ['speaks', 'balance', 'range', 'meanLevel']
const ELECTRIC: RuleId[] = [
  'noiseA',
  'hum',
  'currentPlugged',
  'currentUnplugged',
  'battery',
  'switchOpen',
  'switchClosed',
]
const JACK: RuleId[] = ['tipContinuity', 'disturbanceCount', 'contactTip', 'insulation']
const REST = (...but: RuleId[]): RuleId[] =>
  [...STRINGS, ...ELECTRIC, ...JACK].filter((rule) => !but.includes(rule))

/** What a whole check of a buffered instrument with each fault at string 3 must find, and what it must leave alone. */
const FOUND: Record<FaultId, Expected> = {
  elementOpen: { outside: ['speaks', 'balance'], inside: [...ELECTRIC, ...JACK], verdict: 'fail' },
  elementShorted: { outside: ['speaks', 'balance'], inside: [...ELECTRIC, ...JACK], verdict: 'fail' },
  poorSeating: { outside: ['balance'], inside: REST('balance', 'range'), verdict: 'fail' },
  endsTight: { outside: ['balance', 'range'], inside: REST('balance', 'range'), verdict: 'fail' },
  hollowMiddle: { outside: ['balance', 'range'], inside: REST('balance', 'range'), verdict: 'fail' },
  tiltedSaddle: { outside: ['balance', 'range'], inside: REST('balance', 'range'), verdict: 'fail' },
  stripEndLump: { outside: ['balance', 'range'], inside: REST('balance', 'range'), verdict: 'fail' },
  crossedLeads: {
    outside: ['balance', 'channelSeparation'],
    inside: [...ELECTRIC, ...JACK],
    verdict: 'fail',
  },
  polarityFlipped: { outside: [], inside: REST(), verdict: 'pass' },
  inputLoading: { outside: ['meanLevel'], inside: [...ELECTRIC, ...JACK, 'speaks'], verdict: 'fail' },
  stripShorted: { outside: ['speaks'], inside: [...ELECTRIC, ...JACK], verdict: 'fail' },
  noPower: {
    outside: ['speaks', 'currentPlugged', 'battery'],
    inside: ['switchOpen', 'switchClosed'],
    verdict: 'fail',
  },
  volumeDown: { outside: ['meanLevel'], inside: REST('meanLevel'), verdict: 'fail' },
  lowBattery: { outside: ['battery'], inside: REST('battery'), verdict: 'fail' },
  shieldOpen: { outside: ['hum'], inside: [...STRINGS, ...JACK, 'battery'], verdict: 'fail' },
  dimmerBuzz: { outside: ['hum', 'noiseA'], inside: [...STRINGS, ...JACK, 'battery'], verdict: 'fail' },
  hissyPreamp: { outside: ['noiseA'], inside: REST('noiseA'), verdict: 'fail' },
  crackle: { outside: ['noiseA'], inside: ['battery', 'currentPlugged', ...JACK], verdict: 'fail' },
  wornJack: {
    outside: ['disturbanceCount', 'contactTip'],
    inside: [...STRINGS, ...ELECTRIC],
    verdict: 'fail',
  },
  switchStuckClosed: {
    outside: ['switchOpen', 'currentUnplugged'],
    inside: REST('switchOpen', 'currentUnplugged'),
    verdict: 'fail',
  },
  switchStuckOpen: {
    outside: ['switchClosed', 'speaks', 'currentPlugged'],
    inside: ['switchOpen', 'battery'],
    verdict: 'fail',
  },
  currentHigh: { outside: ['currentPlugged'], inside: REST('currentPlugged'), verdict: 'fail' },
  tipOpen: {
    outside: ['tipContinuity', 'contactTip'],
    inside: REST('tipContinuity', 'contactTip'),
    verdict: 'fail',
  },
  benchHum: { outside: ['hum'], inside: [...STRINGS, ...JACK, 'battery'], verdict: 'fail' },
}

describe('a whole check of an instrument with a fault', () => {
  const setup = setupFor('six', 'buffered')

  it.each(FaultId.options)('finds %s by its own rules and leaves the others alone', (fault) => {
    const run = runHeadless({ seed: SEED, setup, faults: [{ fault, severity: 1, stringNo: 3 }] })
    const outside = outsideOf(run)
    expect(run.phase).toBe('done')
    expect(run.verdict).toBe(FOUND[fault].verdict)
    for (const rule of FOUND[fault].outside) expect([...outside]).toContain(rule)
    for (const rule of FOUND[fault].inside) expect([...outside]).not.toContain(rule)
  })

  it('finds a flipped element where only the sum is heard, and no crossed leads there', () => {
    const atJack = setupFor('one', 'parallel')
    const balances = (faults: FaultId[]): number[] =>
      runHeadless({
        seed: SEED,
        setup: atJack,
        faults: faults.map((fault) => ({ fault, severity: 1, stringNo: 3 })),
      }).strings.map((string) => string.balance.value!)
    const sound = balances([])
    expect(balances(['polarityFlipped'])[2]! - sound[2]!).toBeLessThan(-0.6)
    balances(['crossedLeads']).forEach((balance, i) => expect(balance).toBeCloseTo(sound[i]!, 9))
  })

  it('shows the other five of a parallel strip 1.6 dB up when one element is open', () => {
    const parallel = setupFor('six', 'parallel')
    const sound = runHeadless({ seed: SEED, setup: parallel, scatterDb: 0 })
    const open = runHeadless({
      seed: SEED,
      setup: parallel,
      scatterDb: 0,
      faults: [{ fault: 'elementOpen', severity: 1, stringNo: 3 }],
    })
    for (const i of [0, 1, 3, 4, 5]) {
      const rise = open.strings[i]!.level.value! - sound.strings[i]!.level.value!
      expect(Math.abs(rise - 1.56)).toBeLessThan(0.15)
    }
    expect(open.strings[2]!.state).toBe('silent')
  })

  it('lays the fault where the seed says when no string is told', () => {
    const parts = applyFaults(makeInstrument(SEED, 'buffered'), [{ fault: 'poorSeating', severity: 2 }])
    const weakest = truthOf(parts).balanceDb.map((balance, i) => balance! - PATTERN_DB[i]!)
    const run = runHeadless({ seed: SEED, setup, faults: [{ fault: 'poorSeating', severity: 2 }] })
    const read = run.strings.map((string) => string.balance.value!)
    expect(read.indexOf(Math.min(...read))).toBe(weakest.indexOf(Math.min(...weakest)))
  })
})

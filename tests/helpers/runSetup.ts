import type { RunAction, RunActionBody, RunSetup } from '../../src/shared/contract/runs.ts'
import { RULES, type Capability, type RuleId } from '../../src/shared/contract/rules.ts'
import type { Model, SheetRule, ThresholdSheet } from '../../src/shared/contract/thresholds.ts'

/** Open strings in equal temperament, A4 = 440 Hz; string 1 first (tests/reference/strings.json). */
export const OPEN_HZ = [329.63, 246.94, 196, 146.83, 110, 82.41] as const
const NAMES = ['E', 'B', 'G', 'D', 'A', 'E'] as const

export const SIX_CHANNEL: Capability[] = [
  'sixLevels',
  'jackLevel',
  'noiseA',
  'hum',
  'pitch',
  'plugState',
  'tipContinuity',
  'disturbances',
  'current',
  'battery',
  'pedal',
]
export const ONE_CHANNEL: Capability[] = SIX_CHANNEL.filter((capability) => capability !== 'sixLevels')
export const RECORDING_SIX: Capability[] = ['sixLevels', 'noiseA', 'pitch']
export const RECORDING_ONE: Capability[] = ['jackLevel', 'noiseA', 'pitch']

/** A rule as a sheet holds it, with its default limits. */
export function sheetRule(rule: RuleId, change: Partial<SheetRule> = {}): SheetRule {
  const { low, high, onOutside } = RULES[rule]
  return { rule, low, high, onOutside, required: onOutside === 'reject', ...change }
}

export function buildModel(change: Partial<Model> = {}): Model {
  return {
    id: '0b6f2d5e-3c0a-4a39-9a44-1f2d7a4f0c01',
    key: 'LC6',
    name: 'Lower bout cutaway, six strings',
    strings: 'six',
    handedness: 'right',
    circuit: 'buffered',
    jackKind: 'switchedThreePole',
    tuning: OPEN_HZ.map((hz, i) => ({ stringNo: i + 1, name: NAMES[i]!, pitchesHz: [hz] })),
    isRecording: false,
    ...change,
  }
}

export function buildSheet(change: Partial<ThresholdSheet> = {}): ThresholdSheet {
  return {
    id: '0b6f2d5e-3c0a-4a39-9a44-1f2d7a4f0c02',
    modelId: '0b6f2d5e-3c0a-4a39-9a44-1f2d7a4f0c01',
    label: 'LC-1',
    revision: 1,
    plucks: { n: 3, nMax: 6, largestSDb: 2 },
    guard: { on: false, balanceU: 0.8, levelU: 1 },
    noiseStretchMs: 2000,
    wiggleMs: 5000,
    patternDb: [0, 0, 0, 0, 0, 0],
    patternUDb: 0.2,
    patternInstruments: 12,
    referenceLevelDb: -20,
    rules: (Object.keys(RULES) as RuleId[])
      .filter((rule) => !['contactTip', 'contactRing', 'contactSleeve', 'insulation', 'hum'].includes(rule))
      .map((rule) => sheetRule(rule)),
    ...change,
  }
}

/** A verified six-channel bench of 10 ms frames with every usual rule; change what the test is about. */
export function buildSetup(
  change: Partial<Omit<RunSetup, 'model' | 'sheet' | 'conditions'>> & {
    model?: Partial<Model>
    sheet?: Partial<ThresholdSheet>
    conditions?: Partial<RunSetup['conditions']>
  } = {},
): RunSetup {
  const { model, sheet, conditions, ...rest } = change
  const channels = rest.channelKind === 'one' ? 1 : 6
  return {
    method: 1,
    frameMs: 10,
    channelKind: 'six',
    capabilities: channels === 1 ? ONE_CHANNEL : SIX_CHANNEL,
    algorithms: { rms: '1' },
    mainsHz: 50,
    calibrationDb: Array.from({ length: channels }, () => 0),
    uCalOwnDb: 0.05,
    uCalSharedDb: 0.1,
    floorDb: Array.from({ length: channels }, () => -100),
    studySDb: null,
    verified: true,
    verificationId: '0b6f2d5e-3c0a-4a39-9a44-1f2d7a4f0c03',
    person: 'Bench test',
    ...rest,
    conditions: {
      stringSet: '12-53',
      strungMinutes: 60,
      tunedToPitch: true,
      humidityPercent: 45,
      temperatureC: 21,
      controlsSet: true,
      excitation: 'hand',
      mute: 'felt',
      ...conditions,
    },
    model: buildModel(model),
    sheet: buildSheet(sheet),
  }
}

/** A set-up for a recording: noise and strings only, and only the rules that a recording can tell. */
export function buildRecordingSetup(
  channelKind: 'six' | 'one' = 'six',
  sheet: Partial<ThresholdSheet> = {},
): RunSetup {
  return buildSetup({
    channelKind,
    capabilities: channelKind === 'six' ? RECORDING_SIX : RECORDING_ONE,
    model: { isRecording: true },
    sheet: {
      rules: (['speaks', 'balance', 'range', 'step', 'snFlat', 'noiseFlat'] as const).map((rule) =>
        sheetRule(rule),
      ),
      ...sheet,
    },
  })
}

/** An action as it is stored. */
export function buildAction(action: RunActionBody, frame: number, no = 1): RunAction {
  return {
    id: `0b6f2d5e-3c0a-4a39-9a44-${String(100_000_000_000 + no)}`,
    no,
    frame,
    userId: '0b6f2d5e-3c0a-4a39-9a44-1f2d7a4f0c04',
    person: 'Bench test',
    at: '2026-12-01T08:00:00.000Z',
    action,
  }
}

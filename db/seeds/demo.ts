import { createHash } from 'node:crypto'
import type { Role } from '../../src/shared/contract/permissions.ts'
import { RULES, RuleId } from '../../src/shared/contract/rules.ts'
import type { Model, SheetRule, StringPitch, ThresholdSheet } from '../../src/shared/contract/thresholds.ts'

/**
 * The invented workshop of the demo. Every name, serial and number here is made up for it; limits are the defaults
 * of the rules, patterns and reference levels come from modelled instruments.
 */
export const WORKSHOP = {
  name: 'Harrow Lane Instruments',
  timeZone: 'Europe/London',
  shifts: [
    { name: 'early', from: '06:00', to: '14:00' },
    { name: 'late', from: '14:00', to: '22:00' },
    { name: 'night', from: '22:00', to: '06:00' },
  ],
  serialPattern: 'HL{YY}{NNNNN}',
}

/** The same name always gives the same id, so that two seeds of the demo agree. */
export function demoId(name: string): string {
  const hex = createHash('sha256').update(`evenstrung demo ${name}`).digest('hex')
  return `${hex.slice(0, 8)}-${hex.slice(8, 12)}-4${hex.slice(13, 16)}-a${hex.slice(17, 20)}-${hex.slice(20, 32)}`
}

export const DEMO_PEOPLE: { name: string; email: string; roles: Role[] }[] = [
  { name: 'Ines Marlowe', email: 'installer@harrowlane.test', roles: ['installer'] },
  { name: 'Tobias Fenn', email: 'repairer@harrowlane.test', roles: ['repairer'] },
  { name: 'Quill Adair', email: 'qc@harrowlane.test', roles: ['qc'] },
  { name: 'Edda Lindqvist', email: 'engineer@harrowlane.test', roles: ['engineer'] },
  { name: 'Lorcan Weir', email: 'lead@harrowlane.test', roles: ['lead'] },
  { name: 'Romy Castell', email: 'returns@harrowlane.test', roles: ['returnsDesk'] },
  { name: 'Ada Birch', email: 'admin@harrowlane.test', roles: ['admin'] },
]

export interface DemoBench {
  key: string
  name: string
  code: string
  simulated: boolean
  enrolled: boolean
}

export const DEMO_BENCHES: DemoBench[] = [
  { key: 'window', name: 'Window', code: 'BENCHWINDOW', simulated: true, enrolled: true },
  { key: 'door', name: 'Door', code: 'BENCHDOOR', simulated: true, enrolled: true },
  { key: 'yard', name: 'Yard', code: 'BENCHYARD', simulated: false, enrolled: false },
  { key: 'recordings', name: 'Recordings', code: 'BENCHRECORDINGS', simulated: false, enrolled: true },
]

/** Equal temperament from A4 = 440 Hz (ISO 16), string 1 first. */
const SIX_STRINGS: [string, number][] = [
  ['E', 64],
  ['B', 59],
  ['G', 55],
  ['D', 50],
  ['A', 45],
  ['E', 40],
]

function hzOf(midi: number): number {
  return 440 * 2 ** ((midi - 69) / 12)
}

function tuning(courses: boolean): StringPitch[] {
  return SIX_STRINGS.map(([name, midi], i) => ({
    stringNo: i + 1,
    name,
    // Courses 3 to 6 of a 12-string are doubled at the octave, 1 and 2 in unison: common practice.
    pitchesHz: courses && i >= 2 ? [hzOf(midi), hzOf(midi + 12)] : [hzOf(midi)],
  }))
}

function model(key: string, name: string, more: Partial<Model> = {}): Model {
  return {
    id: demoId(`model ${key}`),
    key,
    name,
    strings: 'six',
    handedness: 'right',
    circuit: 'buffered',
    jackKind: 'switchedThreePole',
    tuning: tuning(more.strings === 'twelve'),
    isRecording: false,
    ...more,
  }
}

export const DEMO_MODELS: Model[] = [
  model('LC', 'Linden concert'),
  model('LCL', 'Linden concert, left-handed', { handedness: 'left' }),
  model('RD', 'Rowan dreadnought', { circuit: 'parallel' }),
  model('AJ12', 'Aspen jumbo 12-string', { strings: 'twelve' }),
  model('REC', 'Recorded six-string', { isRecording: true }),
]

/** Rules that only some benches can measure: they judge where they can and are not required elsewhere. */
const NOT_REQUIRED: readonly RuleId[] = ['contactTip', 'contactRing', 'contactSleeve', 'insulation']
const OF_A_RECORDING: readonly RuleId[] = [
  'speaks',
  'balance',
  'range',
  'step',
  'noiseFlat',
  'noiseA',
  'snFlat',
]

function rule(id: RuleId, more: Partial<SheetRule> = {}): SheetRule {
  const kind = RULES[id]
  return {
    rule: id,
    low: kind.low,
    high: kind.high,
    onOutside: kind.onOutside,
    required: kind.onOutside === 'reject' && !NOT_REQUIRED.includes(id),
    ...more,
  }
}

/**
 * Mean balance of 400 modelled instruments without a fault, string 1 first, sum zero; six-channel and one-channel
 * benches read patterns up to 0.15 dB from this one.
 */
export const DEMO_PATTERN_DB = [-1.9, -0.45, 0.72, 0.38, 0.52, 0.73]
export const DEMO_REFERENCE_DB = -18.8

export function demoSheets(): { sheet: ThresholdSheet; modelId: string }[] {
  return DEMO_MODELS.map((of) => {
    const rules = of.isRecording
      ? OF_A_RECORDING.map((id) => rule(id, id === 'speaks' ? {} : { onOutside: 'advise', required: false }))
      : RuleId.options.map((id) => rule(id))
    const sheet: ThresholdSheet = {
      id: demoId(`sheet ${of.key}`),
      modelId: of.id,
      label: `${of.key}-1`,
      revision: 1,
      plucks: { n: 3, nMax: 6, largestSDb: 1.6 },
      guard: { on: false, balanceU: 0.6, levelU: 0.8 },
      noiseStretchMs: of.isRecording ? 2000 : 5000,
      wiggleMs: 6000,
      patternDb: of.isRecording ? null : DEMO_PATTERN_DB,
      patternUDb: of.isRecording ? 0 : 0.15,
      patternInstruments: of.isRecording ? 0 : 400,
      referenceLevelDb: of.isRecording ? -30 : DEMO_REFERENCE_DB,
      rules,
    }
    return { sheet, modelId: of.id }
  })
}

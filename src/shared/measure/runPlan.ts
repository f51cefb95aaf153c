import { RULES, type Capability, type RuleId } from '../contract/rules.ts'
import type { RunPhase } from '../contract/measured.ts'
import type { RunSetup } from '../contract/runs.ts'
import type { SheetRule } from '../contract/thresholds.ts'
import { capabilitiesCover } from './capabilitiesCover.ts'
import { NOISE_LEAST_MS, NOISE_LEAST_WITH_HUM_MS, TRIES_EXTRA, TRIES_FACTOR } from './constants.ts'
import { isEnterableByHand } from './isEnterableByHand.ts'

/** Everything that follows from the set-up alone, worked out once at the start of a run. */
export interface RunPlan {
  phases: RunPhase[]
  /** level channels: six, or the jack alone */
  channels: number
  /** thousandths of a dB to add to what the bench sends, and the bench's own floor before that is added */
  calibrationDb: number[]
  rawFloorMdb: number[]
  noiseStretchMs: number
  judgesHum: boolean
  n: number
  nMax: number
  triesMax: number
}

const LEVEL_RULES: readonly RuleId[] = [
  'speaks',
  'level',
  'balance',
  'range',
  'step',
  'meanLevel',
  'channelSeparation',
  'snFlat',
  'snA',
]
const REST_RULES: readonly RuleId[] = [
  'switchClosed',
  'tipContinuity',
  'currentPlugged',
  'battery',
  'contactTip',
  'contactRing',
  'contactSleeve',
  'insulation',
]
const UNPLUGGED_RULES: readonly RuleId[] = ['switchOpen', 'currentUnplugged']
const WIGGLE_RULES: readonly RuleId[] = ['tipContinuity', 'disturbanceCount', 'disturbanceLongest']

export function planRun(setup: RunSetup): RunPlan {
  const { sheet, capabilities } = setup
  const channels = setup.channelKind === 'six' ? 6 : 1
  const calibrationDb = Array.from({ length: channels }, (_, i) => setup.calibrationDb[i] ?? 0)
  const judgesHum = sheet.rules.some((r) => r.rule === 'hum') && capabilitiesCover('hum', capabilities)
  return {
    phases: phasesOf(setup),
    channels,
    calibrationDb,
    rawFloorMdb: calibrationDb.map((offset, i) => {
      const floor = ((setup.floorDb[i] ?? -Infinity) - offset) * 1000
      return Number.isNaN(floor) ? -Infinity : floor
    }),
    noiseStretchMs: noiseStretchMsOf(setup),
    judgesHum,
    n: sheet.plucks.n,
    nMax: Math.max(sheet.plucks.n, sheet.plucks.nMax),
    triesMax: TRIES_FACTOR * sheet.plucks.n + TRIES_EXTRA,
  }
}

/** How long the muted stretch is, ms: as the sheet says, at least 2 s, at least 5 s when hum is judged. */
export function noiseStretchMsOf(setup: Pick<RunSetup, 'sheet' | 'capabilities'>): number {
  const judgesHum =
    setup.sheet.rules.some((r) => r.rule === 'hum') && capabilitiesCover('hum', setup.capabilities)
  return Math.max(setup.sheet.noiseStretchMs, judgesHum ? NOISE_LEAST_WITH_HUM_MS : NOISE_LEAST_MS)
}

/** Required rules that this bench cannot measure and that a person can enter from a meter. */
export function rulesToEnter(setup: Pick<RunSetup, 'sheet' | 'capabilities'>): SheetRule[] {
  return setup.sheet.rules.filter(
    (r) => r.required && isEnterableByHand(r.rule) && !capabilitiesCover(r.rule, setup.capabilities),
  )
}

function phasesOf(setup: RunSetup): RunPhase[] {
  const judged = setup.sheet.rules.map((r) => r.rule)
  const uses = (rules: readonly RuleId[]) =>
    rules.some((rule) => judged.includes(rule) && capabilitiesCover(rule, setup.capabilities))
  const can = (capability: Capability) => setup.capabilities.includes(capability)
  const hasLevels = can('sixLevels') || can('jackLevel')
  const onBench = !setup.model.isRecording
  const phases: RunPhase[] = []
  if (onBench && can('plugState') && uses(UNPLUGGED_RULES)) phases.push('unplugged')
  if (onBench && can('plugState')) phases.push('settle')
  if (onBench && uses(REST_RULES)) phases.push('jackRest')
  if (hasLevels) phases.push('noise')
  if (hasLevels && uses(LEVEL_RULES)) phases.push('strings')
  if (onBench && uses(WIGGLE_RULES)) phases.push('wiggleReady', 'wiggle')
  if (rulesToEnter(setup).length > 0) phases.push('entry')
  phases.push('done')
  return phases
}

/** The sheet's rule of that name; undefined when the sheet does not hold it. */
export function sheetRuleOf(setup: Pick<RunSetup, 'sheet'>, rule: RuleId): SheetRule | undefined {
  return setup.sheet.rules.find((r) => r.rule === rule)
}

/** The rule is one result for each element. */
export function isPerElement(rule: RuleId): boolean {
  return RULES[rule].per === 'element'
}

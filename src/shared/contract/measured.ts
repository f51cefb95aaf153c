import { z } from 'zod'
import { Reading, StringNo, Unit } from './quantities.ts'
import { RuleId } from './rules.ts'

/** The steps of a guided run, in their order; a step that the bench or the sheet has no use for is left out. */
export const RunPhase = z.enum([
  'unplugged',
  'settle',
  'jackRest',
  'noise',
  'strings',
  'wiggleReady',
  'wiggle',
  'entry',
  'done',
  'stopped',
])
export type RunPhase = z.infer<typeof RunPhase>

/** What the one sentence on the screen asks for; its words stand in a table of the client. */
export const PromptKey = z.enum([
  'leaveUnplugged',
  'plugIn',
  'waitSettle',
  'holdStill',
  'muteAll',
  'keepMuted',
  'dampThenPluck',
  'pluckAgain',
  'pluckMore',
  'getReadyToWiggle',
  'wiggleNow',
  'enterValues',
  'finished',
  'stopped',
])
export type PromptKey = z.infer<typeof PromptKey>

export const DropReason = z.enum([
  'strum',
  'secondOnset',
  'clipped',
  'wrongPitch',
  'notDamped',
  'shortWindow',
  'interrupted',
  'belowFloor',
  'setAside',
  'stringDone',
])
export type DropReason = z.infer<typeof DropReason>

/** One recognised excitation, kept or dropped; both stay visible. */
export const Pluck = z.object({
  no: z.int().min(1),
  onsetFrame: z.int().min(0),
  stringNo: StringNo.nullable(),
  /** how the string was told: by its pitch, by the element that leads, or only because it was asked for */
  toldBy: z.enum(['pitch', 'lead', 'prompt', 'person']),
  milliHz: z.int().nullable(),
  /** level of that string's channel, noise taken off, dBV; null when there is none */
  levelDb: z.number().nullable(),
  /** before the noise was taken off, dBV */
  rawDb: z.number().nullable(),
  /** censored: the level is at most levelDb */
  atMost: z.boolean(),
  /** level minus the loudest other element, six-channel only */
  separationDb: z.number().nullable(),
  dropped: DropReason.nullable(),
})
export type Pluck = z.infer<typeof Pluck>

export const StringState = z.enum(['todo', 'done', 'silent', 'triesUsed'])
export type StringState = z.infer<typeof StringState>

export const StringResult = z.object({
  stringNo: StringNo,
  name: z.string(),
  state: StringState,
  /** accepted plucks, wanted now (grows with scatter), all tries, the most tries */
  accepted: z.int(),
  wanted: z.int(),
  tries: z.int(),
  triesMax: z.int(),
  /** plucked three times by the person's or another channel's word, and nothing came */
  noSignalCount: z.int(),
  repeated: z.boolean(),
  repeatReason: z.string().nullable(),
  level: Reading,
  /** sample standard deviation of the accepted plucks, dB */
  sDb: z.number().nullable(),
  balance: Reading,
  separation: Reading,
  /** this element is part of the reference */
  inReference: z.boolean(),
})
export type StringResult = z.infer<typeof StringResult>

export const RuleResult = z.object({
  rule: RuleId,
  stringNo: StringNo.nullable(),
  result: z.enum(['within', 'outside', 'invalid', 'notTested']),
  onOutside: z.enum(['reject', 'advise']),
  required: z.boolean(),
  unit: Unit,
  value: z.number().nullable(),
  atMost: z.boolean(),
  n: z.int(),
  low: z.number().nullable(),
  high: z.number().nullable(),
  /** distance to the nearer limit in the rule's unit, negative outside */
  margin: z.number().nullable(),
  expandedU: z.number().nullable(),
  /** probability that the true value conforms, JCGM 106 */
  pConform: z.number().min(0).max(1).nullable(),
  /** why it is outside, invalid or not tested; keys of a table of texts */
  why: z
    .enum([
      'beyondLimit',
      'inGuardBand',
      'noSignal',
      'scatterTooLarge',
      'tooFewPlucks',
      'notMeasurable',
      'notReached',
      'patternNotSet',
      'censoredAcrossLimit',
      'notFinite',
      'disagreesWithState',
      'noReference',
    ])
    .nullable(),
  byHand: z.boolean(),
})
export type RuleResult = z.infer<typeof RuleResult>

export const Verdict = z.enum(['pass', 'fail', 'none'])
export type Verdict = z.infer<typeof Verdict>

export const JackState = z.object({
  /** null: not measured (yet) */
  unpluggedOpen: z.boolean().nullable(),
  pluggedClosed: z.boolean().nullable(),
  tipSteady: z.boolean().nullable(),
  disturbanceCount: z.int().nullable(),
  disturbanceLongestMs: z.number().nullable(),
  contactTipOhm: z.number().nullable(),
  contactRingOhm: z.number().nullable(),
  contactSleeveOhm: z.number().nullable(),
  insulationMohm: z.number().nullable(),
  /** 0..1 of the wiggle */
  wiggleProgress: z.number().min(0).max(1),
  wiggleStartedBy: z.enum(['person', 'pedal', 'itself']).nullable(),
})
export type JackState = z.infer<typeof JackState>

/** Everything measured and judged so far: a pure function of set-up, frames, bench events and human actions. */
export const MeasuredRun = z.object({
  /** frames taken so far */
  frames: z.int().min(0),
  phase: RunPhase,
  prompt: PromptKey,
  promptStringNo: StringNo.nullable(),
  /** phases that this run goes through */
  phases: z.array(RunPhase),
  /** 0..1 of the present phase where it has a length, else null */
  progress: z.number().min(0).max(1).nullable(),
  warnings: z.array(
    z.enum([
      'stringsFresh',
      'patternNotSet',
      'benchNotVerified',
      'batteryLow',
      'notYetQuiet',
      'ruleNotMeasurable',
      'controlsNotSet',
    ]),
  ),
  /** string 1 first */
  strings: z.array(StringResult).length(6),
  plucks: z.array(Pluck),
  /** mean of the elements of the reference, dBV */
  referenceDb: z.number().nullable(),
  provisional: z.boolean(),
  range: Reading,
  step: Reading,
  meanLevel: Reading,
  noise: z.object({
    flat: Reading,
    a: Reading,
    hum: Reading,
    mainsHz: z.int(),
    /** where noise and hum were read: 0 = the jack, 1..6 = that element, the loudest */
    at: z.int().min(0).max(6).nullable().optional(),
    fromFrame: z.int().nullable(),
    toFrame: z.int().nullable(),
  }),
  snFlat: Reading,
  snA: Reading,
  jack: JackState,
  supply: z.object({
    pluggedMa: z.number().nullable(),
    unpluggedUa: z.number().nullable(),
    batteryV: z.number().nullable(),
  }),
  entered: z.array(
    z.object({
      rule: RuleId,
      stringNo: StringNo.nullable(),
      value: z.number(),
      u: z.number(),
      meter: z.string(),
      person: z.string(),
    }),
  ),
  results: z.array(RuleResult),
  /** null until the run is done */
  verdict: Verdict.nullable(),
})
export type MeasuredRun = z.infer<typeof MeasuredRun>

import { z } from 'zod'
import { Id, Instant, StringNo } from './quantities.ts'
import { Capability, RuleId } from './rules.ts'
import { MeasuredRun, Verdict } from './measured.ts'
import { Model, ThresholdSheet } from './thresholds.ts'
import { Algorithms, ChannelKind, FrameMs } from './frames.ts'

/** Stands in capitals; small letters are taken as the capitals they mean. */
export const Serial = z
  .string()
  .toUpperCase()
  .regex(/^[A-Z0-9]{4,32}$/, 'letters and digits only, 4 to 32 of them')

export const RunReason = z.enum(['new', 'retest', 'afterRework', 'return', 'practice', 'recording'])
export type RunReason = z.infer<typeof RunReason>

/** Conditions belong to every run. */
export const RunConditions = z.object({
  stringSet: z.string().max(60),
  /** minutes since stringing; null: not known */
  strungMinutes: z.number().min(0).nullable(),
  tunedToPitch: z.boolean(),
  humidityPercent: z.number().min(0).max(100).nullable(),
  temperatureC: z.number().min(-20).max(60).nullable(),
  /** volume full, tone flat, tuner off */
  controlsSet: z.boolean(),
  excitation: z.enum(['hand', 'wire', 'mechanical']),
  mute: z.enum(['felt', 'hand']),
})
export type RunConditions = z.infer<typeof RunConditions>

export const RunStart = z.object({
  /** made by the client, so that a retry gives the same run */
  id: Id,
  serial: Serial,
  /** needed for a serial that is not known yet */
  modelId: Id.nullable(),
  benchId: Id,
  reason: RunReason,
  conditions: RunConditions,
})
export type RunStart = z.infer<typeof RunStart>

/**
 * Everything beside the trace and the actions that measuring and judging depend on; stored with the run, so that
 * recomputing uses the same.
 */
export const RunSetup = z.object({
  method: z.int().min(1),
  frameMs: FrameMs,
  channelKind: ChannelKind,
  capabilities: z.array(Capability),
  algorithms: Algorithms,
  mainsHz: z.union([z.literal(50), z.literal(60)]),
  /** the bench's own clock at its hello: recorded, never used */
  benchClock: Instant.optional(),
  /** dB to add to each channel's level (six or one of them) */
  calibrationDb: z.array(z.number()),
  /** standard uncertainty of a channel's calibration: what the channels do not share, and what they share */
  uCalOwnDb: z.number().min(0),
  uCalSharedDb: z.number().min(0),
  /** the bench's own noise floor of each channel, dBV, from its verification */
  floorDb: z.array(z.number()),
  /** pooled standard deviation of a pluck from the bench's study, dB; null: pooled over the run */
  studySDb: z.number().min(0).nullable(),
  verified: z.boolean(),
  verificationId: Id.nullable(),
  conditions: RunConditions,
  model: Model,
  sheet: ThresholdSheet,
  /** who opened it: name at that time */
  person: z.string(),
})
export type RunSetup = z.infer<typeof RunSetup>

/** What a person does during a run; stored, with the frame it fell on, before it is answered. */
export const RunActionBody = z.discriminatedUnion('kind', [
  /** Space or a foot switch: go on, as the step means it; while a string is asked for: plucked, nothing came */
  z.object({ kind: z.literal('goOn') }),
  z.object({ kind: z.literal('noSignal'), stringNo: StringNo }),
  z.object({ kind: z.literal('repeatString'), stringNo: StringNo, reason: z.string().min(3).max(200) }),
  z.object({
    kind: z.literal('enterValue'),
    rule: RuleId,
    stringNo: StringNo.nullable(),
    value: z.number(),
    u: z.number().min(0),
    meter: z.string().min(1).max(80),
  }),
  z.object({ kind: z.literal('changePerson'), person: z.string().min(1).max(120) }),
  z.object({ kind: z.literal('stop'), reason: z.string().min(3).max(200) }),
])
export type RunActionBody = z.infer<typeof RunActionBody>

export const RunActionRequest = z.object({ id: Id, action: RunActionBody })
export type RunActionRequest = z.infer<typeof RunActionRequest>

/** As stored: applied after the frames below `frame`, in the order of `no`. */
export const RunAction = z.object({
  id: Id,
  no: z.int().min(1),
  frame: z.int().min(0),
  userId: Id,
  person: z.string(),
  at: Instant,
  action: RunActionBody,
})
export type RunAction = z.infer<typeof RunAction>

export const RunStatus = z.enum(['open', 'sealed', 'stopped', 'interrupted'])
export type RunStatus = z.infer<typeof RunStatus>

/** One run as screens see it, live or from the shelf. */
export const RunView = z.object({
  id: Id,
  serial: z.string(),
  instrumentId: Id,
  benchId: Id,
  benchName: z.string(),
  benchSimulated: z.boolean(),
  openedBy: z.object({ id: Id, name: z.string() }),
  reason: RunReason,
  status: RunStatus,
  /** live: being measured. judgedNotStored: leave it plugged in. stored: safe in the database */
  storage: z.enum(['live', 'judgedNotStored', 'stored']),
  openedAt: Instant,
  endedAt: Instant.nullable(),
  endReason: z.string().nullable(),
  runtime: z.string(),
  benchConnected: z.boolean(),
  committedFrames: z.int().min(0),
  setup: RunSetup,
  measured: MeasuredRun,
  actions: z.array(RunAction),
})
export type RunView = z.infer<typeof RunView>

/** One line of a list of runs. */
export const RunSummary = z.object({
  id: Id,
  serial: z.string(),
  modelName: z.string(),
  benchName: z.string(),
  person: z.string(),
  reason: RunReason,
  status: RunStatus,
  verdict: Verdict.nullable(),
  openedAt: Instant,
  endedAt: Instant.nullable(),
  sheetLabel: z.string(),
  handedness: z.enum(['right', 'left']),
  /** balances in dB, string 1 first, for the small even line */
  balancesDb: z.array(z.number().nullable()).length(6),
  balanceLowDb: z.number().nullable(),
  balanceHighDb: z.number().nullable(),
  failing: z.array(RuleId),
})
export type RunSummary = z.infer<typeof RunSummary>

/** Trace of a run for drawing: one column a channel, thousandths of a dB, thinned to at most `points` frames. */
export const RunTrace = z.object({
  run: Id,
  frameMs: FrameMs,
  frames: z.int(),
  /** frames that one point stands for (the loudest of them) */
  framesPerPoint: z.int().min(1),
  levelMdb: z.array(z.array(z.int())),
  jackMdb: z.array(z.int()),
  segments: z.array(
    z.object({ no: z.int(), fromFrame: z.int(), frames: z.int(), sha256: z.string(), bytes: z.int() }),
  ),
})
export type RunTrace = z.infer<typeof RunTrace>

export const RecomputeReport = z.object({
  run: Id,
  serial: z.string(),
  sameVerdict: z.boolean(),
  sameBits: z.boolean(),
  sameRuntime: z.boolean(),
  largestDifference: z.number(),
  differences: z.array(z.string()),
})
export type RecomputeReport = z.infer<typeof RecomputeReport>

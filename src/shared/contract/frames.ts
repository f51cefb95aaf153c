import { z } from 'zod'
import { Id, Instant, LevelMdb, StringNo } from './quantities.ts'
import { Capability } from './rules.ts'
import { PromptKey, RunPhase, Verdict } from './measured.ts'
import type { SimulationCommand } from './simulation.ts'
import { Problem } from './errors.ts'

/** Bench protocol, namespace /bench, websocket only. DEVELOPERS.md describes it for someone with real hardware. */
export const PROTOCOL_VERSION = 1
export const BENCH_NAMESPACE = '/bench'
/** The most frames one batch may hold. */
export const MAX_BATCH_FRAMES = 200
export const MAX_BATCH_EVENTS = 400

export const ChannelKind = z.enum(['six', 'one'])
export type ChannelKind = z.infer<typeof ChannelKind>

export const FrameMs = z.union([z.literal(5), z.literal(10)])
export type FrameMs = z.infer<typeof FrameMs>

const tri = z.boolean().nullable()

/**
 * What a bench measured in one frame of 5 or 10 ms, flat 20 Hz to 20 kHz unless named A.
 * levelMdb, levelAMdb: one value for each channel, element 1 first (six-channel) or the jack alone (one-channel).
 * jackMdb, jackAMdb: at the output jack. null in a state, current or voltage: not measured.
 */
export const Frame = z.object({
  levelMdb: z.array(LevelMdb).min(1).max(6),
  levelAMdb: z.array(LevelMdb).min(1).max(6),
  jackMdb: LevelMdb,
  jackAMdb: LevelMdb,
  clipped: z.int().min(0).max(100_000),
  plugged: tri,
  ringSleeveClosed: tri,
  tipClosed: tri,
  currentUa: z.int().min(-1_000_000).max(1_000_000).nullable(),
  batteryMv: z.int().min(0).max(60_000).nullable(),
})
export type Frame = z.infer<typeof Frame>

const tenthMs = z.int().min(0).max(2_000_000_000)
/** Which frame the event is sent with, and its own start and duration in tenths of a millisecond of run time. */
const place = { frame: z.int().min(0), startTenthMs: tenthMs, durationTenthMs: tenthMs }
/** 0 = at the output jack, 1..6 = element */
const channel = z.int().min(0).max(6)

export const DisturbanceEvent = z.object({
  kind: z.literal('disturbance'),
  ...place,
  pole: z.enum(['tip', 'ring', 'sleeve']),
})
export const PitchEvent = z.object({
  kind: z.literal('pitch'),
  ...place,
  durationTenthMs: tenthMs.min(600),
  channel,
  milliHz: z.int().min(20_000).max(20_000_000),
  confidencePercent: z.int().min(0).max(100),
})
export const HumEvent = z.object({
  kind: z.literal('hum'),
  ...place,
  durationTenthMs: tenthMs.min(20_000),
  channel,
  mainsHz: z.union([z.literal(50), z.literal(60)]),
  levelMdb: LevelMdb,
})
export const ContactEvent = z.object({
  kind: z.literal('contact'),
  ...place,
  pole: z.enum(['tip', 'ring', 'sleeve']),
  microOhm: z.int().min(0).max(2_000_000_000),
})
export const InsulationEvent = z.object({
  kind: z.literal('insulation'),
  ...place,
  /** more than 5 V is refused: an assembled instrument is never tested with high voltage */
  testMillivolt: z.int().min(1).max(5000),
  kiloOhm: z.int().min(0).max(2_000_000_000),
})
/** The foot switch was pressed. */
export const PedalEvent = z.object({ kind: z.literal('pedal'), ...place })
/** Frames before and after this one are not continuous: the bench was restarted. */
export const DiscontinuityEvent = z.object({ kind: z.literal('discontinuity'), ...place })
/** A recording has ended: what is missing stays untested. */
export const EndOfSourceEvent = z.object({ kind: z.literal('endOfSource'), ...place })

export const BenchEvent = z.discriminatedUnion('kind', [
  DisturbanceEvent,
  PitchEvent,
  HumEvent,
  ContactEvent,
  InsulationEvent,
  PedalEvent,
  DiscontinuityEvent,
  EndOfSourceEvent,
])
export type BenchEvent = z.infer<typeof BenchEvent>
export type PitchEvent = z.infer<typeof PitchEvent>

/** Names and versions of what turned samples into frames; kept with every run. */
export const Algorithms = z.record(z.string().max(40), z.string().max(40))

export const BenchHello = z.object({
  protocolVersion: z.int(),
  channelKind: ChannelKind,
  frameMs: FrameMs,
  mainsHz: z.union([z.literal(50), z.literal(60)]),
  capabilities: z.array(Capability).max(20),
  algorithms: Algorithms,
  /** recorded, never used */
  wallClock: Instant,
  /** run that this bench still holds frames of, and the first frame that it can still send */
  holding: z.object({ run: Id, from: z.int().min(0) }).nullable(),
})
export type BenchHello = z.infer<typeof BenchHello>

export const FrameBatch = z.object({
  run: Id,
  /** number of the first frame of this batch, counted from the run's start */
  from: z.int().min(0),
  frames: z.array(Frame).min(1).max(MAX_BATCH_FRAMES),
  events: z.array(BenchEvent).max(MAX_BATCH_EVENTS),
})
export type FrameBatch = z.infer<typeof FrameBatch>

/** Measurements of the check standard, for a verification record. Levels as the bench reads them. */
export const BenchVerify = z.object({
  id: Id,
  checkStandard: z.string().min(1).max(80),
  /** each channel, each of at least two levels */
  tones: z
    .array(z.object({ channel, appliedMdb: z.int(), measuredMdb: LevelMdb }))
    .min(2)
    .max(28),
  quiet: z.array(z.object({ channel, flatMdb: LevelMdb, aMdb: LevelMdb })).max(7),
  resistances: z
    .array(
      z.object({ appliedMicroOhm: z.int().min(0).nullable(), measuredMicroOhm: z.int().min(0).nullable() }),
    )
    .max(8),
  currents: z.array(z.object({ appliedUa: z.int(), measuredUa: z.int() })).max(4),
})
export type BenchVerify = z.infer<typeof BenchVerify>

export const RunOrder = z.object({
  run: Id,
  serial: z.string(),
  /** number of the next frame that the server wants */
  from: z.int().min(0),
  window: z.int().min(0),
  /** how long the muted stretch must be, so that the bench can measure hum over it */
  noiseStretchMs: z.int(),
  expectedHz: z.array(z.array(z.number())),
  /** circuit of the model: a simulated bench lays an instrument of that kind on itself; a real one needs it not */
  circuit: z.enum(['parallel', 'buffered']).optional(),
})
export type RunOrder = z.infer<typeof RunOrder>

export const RunPrompt = z.object({
  run: Id,
  phase: RunPhase,
  prompt: PromptKey,
  stringNo: StringNo.nullable(),
})
export type RunPrompt = z.infer<typeof RunPrompt>

/** Frames below `committed` are safe in the database: the bench may forget them. */
export const RunCommitted = z.object({ run: Id, committed: z.int().min(0) })
export type RunCommitted = z.infer<typeof RunCommitted>

/** The run has ended and is stored: the bench may forget it all. */
export const RunEnded = z.object({
  run: Id,
  outcome: z.enum(['sealed', 'stopped', 'interrupted']),
  verdict: Verdict.nullable(),
})
export type RunEnded = z.infer<typeof RunEnded>

/** Every answer to a bench: ok with values, or a problem with its code. */
export type BenchAnswer<T extends object> = ({ ok: true } & T) | { ok: false; problem: Problem }

const refusal = z.object({ ok: z.literal(false), problem: Problem })

export const HelloAnswer = z.union([
  z.object({
    ok: z.literal(true),
    benchId: Id,
    name: z.string(),
    /** false: the bench should verify itself before it is used for verdicts */
    verified: z.boolean(),
    verifiedUntil: Instant.nullable(),
    /** the run that is open on this bench, if any */
    order: RunOrder.nullable(),
  }),
  refusal,
])
export type HelloAnswer = z.infer<typeof HelloAnswer>

/** Received up to `next`; safe in the database up to `committed`. */
export const FramesAnswer = z.union([
  z.object({ ok: z.literal(true), next: z.int().min(0), committed: z.int().min(0), window: z.int().min(0) }),
  refusal,
])
export type FramesAnswer = z.infer<typeof FramesAnswer>

export const VerifyAnswer = z.union([
  z.object({
    ok: z.literal(true),
    passed: z.boolean(),
    validUntil: Instant.nullable(),
    reasons: z.array(z.string()),
  }),
  refusal,
])
export type VerifyAnswer = z.infer<typeof VerifyAnswer>

export interface BenchToServer {
  'bench:hello': (hello: BenchHello, answer: (a: HelloAnswer) => void) => void
  'bench:frames': (batch: FrameBatch, answer: (a: FramesAnswer) => void) => void
  'bench:verify': (verify: BenchVerify, answer: (a: VerifyAnswer) => void) => void
}

export interface ServerToBench {
  /** start streaming frames of this run, from this frame on */
  'run:start': (order: RunOrder) => void
  'run:prompt': (prompt: RunPrompt) => void
  /** frames below this number are safe: the bench may forget them */
  'run:committed': (message: RunCommitted) => void
  /** the run has ended and is stored: the bench may forget it all */
  'run:ended': (message: RunEnded) => void
  'bench:refused': (problem: Problem) => void
  'bench:replaced': (problem: Problem) => void
  /** simulated benches only */
  'bench:simulate': (command: SimulationCommand, answer: (a: BenchAnswer<object>) => void) => void
}

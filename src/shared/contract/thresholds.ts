import { z } from 'zod'
import { RuleId } from './rules.ts'
import { Id, Instant, StringNo } from './quantities.ts'

export const SheetRule = z.object({
  rule: RuleId,
  low: z.number().nullable(),
  high: z.number().nullable(),
  onOutside: z.enum(['reject', 'advise']),
  required: z.boolean(),
})
export type SheetRule = z.infer<typeof SheetRule>

export const RevisionStatus = z.enum(['draft', 'proposed', 'inForce', 'withdrawn'])

/** The immutable body of one revision of a threshold sheet: everything that judging a run needs to know of it. */
export const ThresholdSheet = z.object({
  id: Id,
  modelId: Id,
  /** short name with the revision's number, for people: 'LC-7' */
  label: z.string().min(1).max(40),
  revision: z.int().min(1),
  /** accepted plucks of each string: wanted, at most, and the largest sample standard deviation */
  plucks: z.object({
    n: z.int().min(3).max(12),
    nMax: z.int().min(3).max(24),
    largestSDb: z.number().positive(),
  }),
  /** fixed from the approved budget; off = simple acceptance */
  guard: z.object({ on: z.boolean(), balanceU: z.number().min(0), levelU: z.number().min(0) }),
  noiseStretchMs: z.int().min(2000).max(20000),
  wiggleMs: z.int().min(5000).max(10000),
  /** six offsets in dB, element 1 first, sum zero; null = pattern not set, balance rules only advise */
  patternDb: z.array(z.number()).length(6).nullable(),
  patternUDb: z.number().min(0),
  patternInstruments: z.int().min(0),
  referenceLevelDb: z.number(),
  rules: z.array(SheetRule).min(1),
})
export type ThresholdSheet = z.infer<typeof ThresholdSheet>

export const SheetSummary = z.object({
  id: Id,
  label: z.string(),
  revision: z.int(),
  status: RevisionStatus,
  inForceFrom: Instant.nullable(),
})
export type SheetSummary = z.infer<typeof SheetSummary>

/** One string (or course) of a model: its name for people and the pitches that count as it, in Hz. */
export const StringPitch = z.object({
  stringNo: StringNo,
  name: z.string().min(1).max(4),
  pitchesHz: z.array(z.number().positive()).min(1).max(2),
})
export type StringPitch = z.infer<typeof StringPitch>

export const Model = z.object({
  id: Id,
  key: z.string().regex(/^[A-Z0-9]{2,12}$/),
  name: z.string().min(1).max(80),
  strings: z.enum(['six', 'twelve']),
  handedness: z.enum(['right', 'left']),
  circuit: z.enum(['parallel', 'buffered']),
  jackKind: z.enum(['switchedThreePole']),
  /** string 1 first */
  tuning: z.array(StringPitch).length(6),
  isRecording: z.boolean(),
})
export type Model = z.infer<typeof Model>

import { z } from 'zod'
import { Id, Instant } from './quantities.ts'
import { Capability } from './rules.ts'
import { ChannelKind } from './frames.ts'
import { Model, SheetSummary, ThresholdSheet } from './thresholds.ts'
import { RunSummary, Serial } from './runs.ts'
import { Verdict } from './measured.ts'

export const BenchView = z.object({
  id: Id,
  name: z.string(),
  /** what is printed on its bench label and scanned */
  code: Serial,
  enrolled: z.boolean(),
  simulated: z.boolean(),
  channelKind: ChannelKind.nullable(),
  capabilities: z.array(Capability),
  connected: z.boolean(),
  verifiedAt: Instant.nullable(),
  verifiedUntil: Instant.nullable(),
  verified: z.boolean(),
  openRun: z.object({ id: Id, serial: z.string(), person: z.string() }).nullable(),
})
export type BenchView = z.infer<typeof BenchView>

export const ModelView = Model.extend({
  sheetInForce: SheetSummary.nullable(),
  /** the body of the sheet in force, so that the Check screen can say in advance what a bench cannot measure */
  sheet: ThresholdSheet.nullable().optional(),
})
export type ModelView = z.infer<typeof ModelView>

export const InstrumentSummary = z.object({
  id: Id,
  serial: z.string(),
  modelId: Id,
  modelName: z.string(),
  createdAt: Instant,
  runs: z.int(),
  lastRunAt: Instant.nullable(),
  lastVerdict: Verdict.nullable(),
})
export type InstrumentSummary = z.infer<typeof InstrumentSummary>

export const InstrumentView = z.object({
  instrument: InstrumentSummary,
  model: Model,
  runs: z.array(RunSummary),
})
export type InstrumentView = z.infer<typeof InstrumentView>

export const Cautions = z.object({
  acknowledged: z.boolean(),
  shift: z.string(),
  acknowledgedAt: Instant.nullable(),
})
export type Cautions = z.infer<typeof Cautions>

/** Where a scan leads. */
export const ScanTarget = z.discriminatedUnion('kind', [
  z.object({ kind: z.literal('instrument'), serial: z.string(), modelName: z.string() }),
  z.object({ kind: z.literal('bench'), benchId: Id, name: z.string() }),
  z.object({ kind: z.literal('run'), runId: Id }),
  z.object({ kind: z.literal('unknownSerial'), serial: z.string() }),
])
export type ScanTarget = z.infer<typeof ScanTarget>

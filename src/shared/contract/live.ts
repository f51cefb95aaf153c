import { z } from 'zod'
import { Id, LevelMdb, StringNo } from './quantities.ts'
import { Pluck } from './measured.ts'
import type { RunView } from './runs.ts'
import type { BenchView } from './workshop.ts'
import type { Problem } from './errors.ts'

/** Screens, namespace /live, websocket only, with the sign-in's cookie. */
export const LIVE_NAMESPACE = '/live'
/** Live values are thinned to about this many updates a second and may be skipped. */
export const LIVE_UPDATES_PER_SECOND = 20

export const WatchRun = z.object({ run: Id })
export const WatchBenches = z.object({})

/** Thinned levels: the loudest frame of each channel since the last update. */
export const LiveLevels = z.object({
  run: Id,
  /** last frame that is in it */
  frame: z.int(),
  levelMdb: z.array(LevelMdb),
  jackMdb: LevelMdb,
  plugged: z.boolean().nullable(),
  ringSleeveClosed: z.boolean().nullable(),
  tipClosed: z.boolean().nullable(),
})
export type LiveLevels = z.infer<typeof LiveLevels>

export const LivePluck = z.object({ run: Id, stringNo: StringNo.nullable(), pluck: Pluck })
export type LivePluck = z.infer<typeof LivePluck>

export type LiveAnswer<T extends object> = ({ ok: true } & T) | { ok: false; problem: Problem }

export interface ScreenToServer {
  /** joins the run's room; the whole state comes with the answer, then changes follow */
  'watch:run': (message: z.infer<typeof WatchRun>, answer: (a: LiveAnswer<{ view: RunView }>) => void) => void
  'unwatch:run': (message: z.infer<typeof WatchRun>, answer: (a: LiveAnswer<object>) => void) => void
  'watch:benches': (
    message: z.infer<typeof WatchBenches>,
    answer: (a: LiveAnswer<{ benches: BenchView[] }>) => void,
  ) => void
}

export interface ServerToScreen {
  /** whole state after every change of step, pluck, reading, verdict, storage: never skipped */
  'run:view': (view: RunView) => void
  /** a pluck was recognised, kept or dropped: never skipped */
  'run:pluck': (pluck: LivePluck) => void
  /** thinned, may be skipped */
  'run:levels': (levels: LiveLevels) => void
  'bench:view': (bench: BenchView) => void
  /** the sign-in behind this socket has ended */
  'session:ended': (problem: Problem) => void
  /** a message that came without an answer function was refused */
  'session:refused': (problem: Problem) => void
}

import { EventEmitter } from 'node:events'
import { setTimeout as wait } from 'node:timers/promises'
import type { Knex } from 'knex'
import type { Logger } from 'pino'
import type { FrameBatch } from '../../src/shared/contract/frames.ts'
import { LIVE_UPDATES_PER_SECOND } from '../../src/shared/contract/live.ts'
import { MeasuredRun } from '../../src/shared/contract/measured.ts'
import type { RunAction, RunActionBody } from '../../src/shared/contract/runs.ts'
import { insertAudit } from '../audit/audit.queries.ts'
import { ingestFrames } from '../bench/ingestFrames.ts'
import { sealRun } from '../bench/sealRun.ts'
import { isStorageAway } from '../connect.ts'
import { AppError } from '../errors.ts'
import { applyAllWaiting, loadOpenRun } from './loadOpenRun.ts'
import { measuredOf, openRunOf } from './openRun.ts'
import type { OpenRun } from './openRun.ts'
import { insertAction, insertSegment, interruptRun, openRunIds, updateOpener } from './runs.queries.ts'
import type { RunRow } from './runs.queries.ts'
import { storeAction } from './storeAction.ts'

/** A segment of the trace is committed when this much run time has come in. */
export const SEGMENT_MS = 30_000
const MEASURING_FAILED = 'measuring failed; the trace is kept and can be computed again'
const UNREADABLE = 'the run could not be read back; trace and actions are kept'
const TOO_LONG = 'the run took longer than half an hour'
/** A check takes a minute or two: what streams on for this long was forgotten. */
const MOST_RUN_MS = 30 * 60_000
/** How often open runs of the database are looked for that nobody here measures. */
const ADOPT_EVERY_MS = 30_000
const RETRY_MS = [200, 500, 1000, 2000, 5000]
const LEVELS_EVERY_MS = 1000 / LIVE_UPDATES_PER_SECOND

export interface RunBoardDeps {
  knex: Knex
  log: Logger
  now: () => Date
  /** ms that have passed on a clock that is never set; by it silence is told */
  elapsedMs: () => number
  /** a bench that is silent for this long leaves its run interrupted */
  silenceMs: number
}

/** What others are told of; a listener never delays or breaks the run. */
export interface RunBoardEvents {
  /** something changed that a screen or the bench's display shows */
  changed: [OpenRun]
  levels: [OpenRun]
  committed: [OpenRun]
  ended: [OpenRun]
}

export type Actor = { id: string; name: string; mayStopAny: boolean }

/** Keeps the open runs: takes frames and actions, commits traces, ends runs. */
export class RunBoard {
  readonly events = new EventEmitter<RunBoardEvents>()
  private readonly deps: RunBoardDeps
  private readonly runs = new Map<string, OpenRun>()
  private readonly byBench = new Map<string, OpenRun>()
  private readonly shown = new WeakMap<OpenRun, { change: number; levelsAtMs: number }>()
  private readonly closing = new AbortController()
  private readonly adopting = new Map<string, Promise<OpenRun | null>>()
  private readonly sweepEveryMs: number
  private readonly timers: NodeJS.Timeout[]
  private sweptAtMs: number

  constructor(deps: RunBoardDeps) {
    this.deps = deps
    this.sweepEveryMs = Math.min(5000, deps.silenceMs / 4)
    this.sweptAtMs = deps.elapsedMs()
    this.timers = [
      setInterval(() => this.interruptSilent(), this.sweepEveryMs).unref(),
      setInterval(() => void this.adoptOrphans(), ADOPT_EVERY_MS).unref(),
    ]
  }

  open(row: RunRow): OpenRun {
    const there = this.runs.get(row.id)
    return there ?? this.add(openRunOf(row, this.deps.elapsedMs()))
  }

  find(runId: string): OpenRun | undefined {
    return this.runs.get(runId)
  }

  onBench(benchId: string): OpenRun | undefined {
    return this.byBench.get(benchId)
  }

  /** Open runs of the database, measured again as far as their traces were committed. */
  async restore(): Promise<number> {
    const ids = await openRunIds(this.deps.knex)
    for (const id of ids) await this.adopt(id)
    return ids.length
  }

  /**
   * Takes an open run of the database that is not measured here: after a restart, or when the outcome of its start
   * was not known. One that cannot be read back ends without a verdict and holds nobody up. null: it is not open.
   */
  adopt(id: string): Promise<OpenRun | null> {
    const there = this.runs.get(id)
    if (there) return Promise.resolve(there)
    const underWay = this.adopting.get(id)
    if (underWay) return underWay
    const work = this.load(id).finally(() => this.adopting.delete(id))
    this.adopting.set(id, work)
    return work
  }

  private async load(id: string): Promise<OpenRun | null> {
    let loaded: OpenRun | null
    try {
      loaded = await loadOpenRun(this.deps.knex, id, this.deps.elapsedMs())
    } catch (error) {
      if (isStorageAway(error)) throw error
      this.deps.log.error({ err: error, run: id }, 'an open run could not be read back')
      await this.giveUp(id)
      return null
    }
    if (!loaded) return null
    const run = this.runs.get(id) ?? this.add(loaded)
    this.endWhenFinished(run)
    return run
  }

  private giveUp(id: string): Promise<void> {
    const at = this.deps.now()
    return this.deps.knex.transaction(async (trx) => {
      if (!(await interruptRun(trx, id, UNREADABLE, at))) return
      const entry = {
        userId: null,
        actor: 'server',
        action: 'run.interrupted',
        subject: 'run',
        subjectId: id,
      }
      await insertAudit(trx, { ...entry, details: { reason: UNREADABLE } }, at)
    })
  }

  private async adoptOrphans(): Promise<void> {
    try {
      for (const id of await openRunIds(this.deps.knex)) if (!this.runs.has(id)) await this.adopt(id)
    } catch (error) {
      this.deps.log.warn({ err: error }, 'open runs could not be looked for')
    }
  }

  /** A batch of frames from the bench that holds the run. */
  takeFrames(run: OpenRun, batch: FrameBatch): Promise<{ next: number; committed: number }> {
    return run.queue.add(() => {
      if (run.ending) throw new AppError('run.not-open', { facts: { next: run.next } })
      run.lastHeardMs = this.deps.elapsedMs()
      ingestFrames(run, batch)
      this.announce(run)
      this.commitWhenDue(run)
      this.endWhenFinished(run)
      if (run.next * run.row.setup.frameMs >= MOST_RUN_MS) this.end(run, 'interrupted', TOO_LONG)
      return { next: run.next, committed: run.committed }
    })
  }

  /** Something a person does: stored with its frame before it is answered. A repeat of the same id changes nothing. */
  act(run: OpenRun, id: string, body: RunActionBody, actor: Actor): Promise<MeasuredRun> {
    return run.queue.add(async () => {
      if (run.actions.some((action) => action.id === id)) return measuredOf(run)
      if (run.ending) throw new AppError('run.not-open')
      const own = actor.id === run.row.openedBy.id
      if (!own && !(body.kind === 'stop' && actor.mayStopAny))
        throw new AppError('run.not-yours', { facts: { person: run.row.openedBy.name } })
      const refusal = run.method.refusalOf(run.state, body)
      if (refusal) throw new AppError('run.action-not-now', { detail: refusal })
      const action = this.actionOf(run, id, body, actor)
      await storeAction(this.deps.knex, run, () => insertAction(this.deps.knex, run.row.seq, action))
      return this.apply(run, action)
    })
  }

  /** Another person goes on with the run. */
  takeOver(run: OpenRun, id: string, reason: string, actor: Actor): Promise<MeasuredRun> {
    return run.queue.add(async () => {
      if (run.actions.some((action) => action.id === id)) return measuredOf(run)
      if (run.ending) throw new AppError('run.not-open')
      if (actor.id !== run.row.openedBy.id && !actor.mayStopAny)
        throw new AppError('run.not-yours', { facts: { person: run.row.openedBy.name } })
      const action = this.actionOf(run, id, { kind: 'changePerson', person: actor.name }, actor)
      await storeAction(this.deps.knex, run, () =>
        this.deps.knex.transaction(async (trx) => {
          await insertAction(trx, run.row.seq, action)
          await updateOpener(trx, run.row.seq, actor.id)
          await insertAudit(
            trx,
            {
              userId: actor.id,
              actor: actor.name,
              action: 'run.takenOver',
              subject: 'run',
              subjectId: run.row.id,
              details: { from: run.row.openedBy.name, reason },
            },
            this.deps.now(),
          )
        }),
      )
      run.row.openedBy = { id: actor.id, name: actor.name }
      return this.apply(run, action)
    })
  }

  /** The bench came or went: whoever looks at its run is told. */
  benchChanged(benchId: string): void {
    const run = this.byBench.get(benchId)
    if (run) this.tell('changed', run)
  }

  /** Waits for what is being stored; open runs stay open in the database and are restored at the next start. */
  async close(): Promise<void> {
    for (const timer of this.timers) clearInterval(timer)
    this.closing.abort()
    for (const run of [...this.runs.values()]) {
      await run.queue.idle()
      await run.storing.idle()
    }
  }

  private add(run: OpenRun): OpenRun {
    this.runs.set(run.row.id, run)
    this.byBench.set(run.row.benchId, run)
    return run
  }

  private actionOf(run: OpenRun, id: string, action: RunActionBody, actor: Actor): RunAction {
    const last = run.actions.at(-1)
    return {
      id,
      no: (last?.no ?? 0) + 1,
      frame: Math.max(run.next, last?.frame ?? 0),
      userId: actor.id,
      person: actor.name,
      at: this.deps.now().toISOString(),
      action,
    }
  }

  private apply(run: OpenRun, action: RunAction): MeasuredRun {
    run.actions.push(action)
    const isStop = action.action.kind === 'stop'
    if (isStop) applyAllWaiting(run)
    if (!isStop && (run.waiting.length > 0 || action.frame > run.next)) run.waiting.push(action)
    else run.method.takeAction(run.state, action)
    this.tell('changed', run)
    this.endWhenFinished(run)
    return measuredOf(run)
  }

  private announce(run: OpenRun): void {
    const nowMs = this.deps.now().getTime()
    const shown = this.shown.get(run) ?? { change: -1, levelsAtMs: 0 }
    this.shown.set(run, shown)
    if (nowMs - shown.levelsAtMs >= LEVELS_EVERY_MS || nowMs < shown.levelsAtMs) {
      shown.levelsAtMs = nowMs
      this.tell('levels', run)
    }
    const change = run.method.changeCount(run.state)
    if (change !== shown.change) {
      shown.change = change
      this.tell('changed', run)
    }
  }

  private commitWhenDue(run: OpenRun): void {
    const segmentFrames = SEGMENT_MS / run.row.setup.frameMs
    if (run.committing || run.buffer.frames < segmentFrames) return
    run.committing = true
    this.inOrder(run, async () => {
      await this.commit(run, segmentFrames)
      run.committing = false
    })
  }

  private async commit(run: OpenRun, frames: number): Promise<void> {
    const segment = run.buffer.pack(run.segmentNo, run.committed, frames)
    const stored = await this.untilStored(run, () =>
      insertSegment(this.deps.knex, run.row.seq, segment, this.deps.now()),
    )
    if (!stored) {
      run.halted = true
      return
    }
    run.segmentNo++
    run.committed += frames
    run.buffer.drop(frames, run.committed)
    this.tell('committed', run)
  }

  private endWhenFinished(run: OpenRun): void {
    if (run.ending) return
    if (run.fault) {
      this.deps.log.error({ err: run.fault, run: run.row.id }, 'measuring failed, the trace is kept')
      this.end(run, 'interrupted', MEASURING_FAILED)
    } else if (run.method.phaseOf(run.state) === 'stopped') {
      const stop = run.actions.findLast(({ action }) => action.kind === 'stop')?.action
      this.end(run, 'stopped', stop?.kind === 'stop' ? stop.reason : null)
    } else if (run.method.isFinished(run.state)) this.end(run, 'sealed', null)
  }

  private end(run: OpenRun, status: 'sealed' | 'stopped' | 'interrupted', reason: string | null): void {
    if (run.ending) return
    run.storage = 'judgedNotStored'
    applyAllWaiting(run)
    const measured = measuredOf(run)
    const shape = MeasuredRun.safeParse(measured)
    if (!shape.success) {
      // What cannot be read back is not stored as readings; the trace is, and the run can be computed again.
      this.deps.log.error({ err: shape.error, run: run.row.id }, 'readings do not have their shape')
      run.fault ??= shape.error
      run.measured = run.method.viewRun(run.method.startRun(run.row.setup))
    }
    run.ending = shape.success ? { status, reason } : { status: 'interrupted', reason: MEASURING_FAILED }
    this.tell('changed', run)
    this.inOrder(run, () => this.seal(run))
  }

  private async seal(run: OpenRun): Promise<void> {
    if (run.halted) return
    const stored = await this.untilStored(run, () =>
      sealRun(this.deps.knex, run, run.measured, this.deps.now()),
    )
    if (!stored) return
    run.storage = 'stored'
    run.committed = run.next
    this.runs.delete(run.row.id)
    if (this.byBench.get(run.row.benchId) === run) this.byBench.delete(run.row.benchId)
    this.tell('ended', run)
  }

  /**
   * Tries until the database has it; false only when this server is closing. A commit whose outcome was unknown is
   * harmless: a segment's place is taken by itself, and a run that is not open any more is not sealed again.
   */
  private async untilStored(run: OpenRun, work: () => Promise<unknown>): Promise<boolean> {
    for (let round = 0; ; round++) {
      try {
        await work()
        return true
      } catch (error) {
        this.deps.log.error({ err: error, run: run.row.id, round }, 'not stored yet, trying again')
      }
      if (this.closing.signal.aborted) return false
      const waitMs = RETRY_MS[Math.min(round, RETRY_MS.length - 1)]!
      await wait(waitMs, undefined, { signal: this.closing.signal }).catch(() => undefined)
      if (this.closing.signal.aborted) return false
    }
  }

  private interruptSilent(): void {
    const nowMs = this.deps.elapsedMs()
    // After a pause of the whole process this timer comes before the frames that wait to be read.
    const wasPaused = nowMs - this.sweptAtMs > 2 * this.sweepEveryMs
    this.sweptAtMs = nowMs
    for (const run of this.runs.values()) {
      if (wasPaused) run.lastHeardMs = nowMs
      if (run.ending || nowMs - run.lastHeardMs < this.deps.silenceMs) continue
      this.end(run, 'interrupted', 'the bench fell silent')
    }
  }

  /** Commits and the end of one run, one after the other; a fault there must not end the process. */
  private inOrder(run: OpenRun, work: () => Promise<void>): void {
    run.storing.add(work).catch((error: unknown) => {
      run.halted = true
      this.deps.log.error({ err: error, run: run.row.id }, 'storing a run failed')
    })
  }

  private tell(event: keyof RunBoardEvents, run: OpenRun): void {
    try {
      this.events.emit(event, run)
    } catch (error) {
      this.deps.log.error({ err: error, run: run.row.id, event }, 'a listener failed')
    }
  }
}

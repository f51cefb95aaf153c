import { EventEmitter } from 'node:events'
import { setTimeout as wait } from 'node:timers/promises'
import type { Knex } from 'knex'
import type { Logger } from 'pino'
import type { FrameBatch } from '../../src/shared/contract/frames.ts'
import { LIVE_UPDATES_PER_SECOND } from '../../src/shared/contract/live.ts'
import { MeasuredRun } from '../../src/shared/contract/measured.ts'
import type { RunAction, RunActionBody } from '../../src/shared/contract/runs.ts'
import { replayStored } from '../../src/shared/measure/replayStored.ts'
import { insertAudit } from '../audit/audit.queries.ts'
import { ingestFrames } from '../bench/ingestFrames.ts'
import { sealRun } from '../bench/sealRun.ts'
import { isDuplicate, isStorageAway } from '../connect.ts'
import { AppError } from '../errors.ts'
import { measuredOf, openRunOf } from './openRun.ts'
import type { OpenRun } from './openRun.ts'
import {
  deleteOtherActions,
  findActions,
  findOpenRuns,
  findSegments,
  insertAction,
  insertSegment,
  updateOpener,
} from './runs.queries.ts'
import type { RunRow } from './runs.queries.ts'
import { unpackTrace } from './traceSegment.ts'

/** A segment of the trace is committed when this much run time has come in. */
export const SEGMENT_MS = 30_000
const MEASURING_FAILED = 'measuring failed; the trace is kept and can be computed again'
const RETRY_MS = [200, 500, 1000, 2000, 5000]
const LEVELS_EVERY_MS = 1000 / LIVE_UPDATES_PER_SECOND

export interface RunBoardDeps {
  knex: Knex
  log: Logger
  now: () => Date
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
  private readonly sweep: NodeJS.Timeout

  constructor(deps: RunBoardDeps) {
    this.deps = deps
    this.sweep = setInterval(() => this.interruptSilent(), Math.min(5000, deps.silenceMs / 4))
    this.sweep.unref()
  }

  open(row: RunRow): OpenRun {
    const run = openRunOf(row, this.deps.now().getTime())
    this.add(run)
    return run
  }

  find(runId: string): OpenRun | undefined {
    return this.runs.get(runId)
  }

  onBench(benchId: string): OpenRun | undefined {
    return this.byBench.get(benchId)
  }

  /** Open runs of the database, replayed as far as their traces were committed. */
  async restore(): Promise<number> {
    const rows = await findOpenRuns(this.deps.knex)
    for (const row of rows) {
      if (this.runs.has(row.id)) continue
      const segments = await findSegments(this.deps.knex, row.seq)
      const actions = await findActions(this.deps.knex, row.seq)
      const run = openRunOf(row, this.deps.now().getTime())
      const { frames, events } = unpackTrace(segments)
      const replayed = replayStored(row.setup, frames, events, actions, false)
      Object.assign(run, {
        state: replayed.state,
        next: replayed.frames,
        committed: replayed.frames,
        segmentNo: segments.length,
        actions,
        waiting: replayed.left,
      })
      this.add(run)
      this.endWhenFinished(run)
    }
    return rows.length
  }

  /** A batch of frames from the bench that holds the run. */
  takeFrames(run: OpenRun, batch: FrameBatch): Promise<{ next: number; committed: number }> {
    return run.queue.add(() => {
      if (run.ending) throw new AppError('run.not-open', { facts: { next: run.next } })
      run.lastHeardMs = this.deps.now().getTime()
      ingestFrames(run, batch)
      this.announce(run)
      this.commitWhenDue(run)
      this.endWhenFinished(run)
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
      await this.store(run, () => insertAction(this.deps.knex, run.row.seq, action))
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
      await this.store(run, () =>
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
    if (run) this.events.emit('changed', run)
  }

  /** Waits for what is being stored; open runs stay open in the database and are restored at the next start. */
  async close(): Promise<void> {
    clearInterval(this.sweep)
    this.closing.abort()
    for (const run of [...this.runs.values()]) {
      await run.queue.idle()
      await run.storing.idle()
    }
  }

  private add(run: OpenRun): void {
    this.runs.set(run.row.id, run)
    this.byBench.set(run.row.benchId, run)
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

  /**
   * After an insert whose outcome is not known its person is told that it was not stored; should it be there all
   * the same it is removed before anything else is stored, so that the database says what the person was told.
   */
  private async store(run: OpenRun, insert: () => Promise<unknown>): Promise<void> {
    const kept = run.actions.map((action) => action.id)
    try {
      if (run.actionsUncertain) {
        await deleteOtherActions(this.deps.knex, run.row.seq, kept)
        run.actionsUncertain = false
      }
      await insert()
    } catch (error) {
      if (isDuplicate(error)) throw new AppError('record.exists')
      if (!isStorageAway(error)) throw error
      run.actionsUncertain = true
      throw new AppError('storage.away')
    }
  }

  private apply(run: OpenRun, action: RunAction): MeasuredRun {
    run.actions.push(action)
    if (run.waiting.length > 0 || action.frame > run.next) run.waiting.push(action)
    else run.method.takeAction(run.state, action)
    this.events.emit('changed', run)
    if (action.action.kind === 'stop') this.end(run, 'stopped', action.action.reason)
    else this.endWhenFinished(run)
    return measuredOf(run)
  }

  private announce(run: OpenRun): void {
    const nowMs = this.deps.now().getTime()
    const shown = this.shown.get(run) ?? { change: -1, levelsAtMs: 0 }
    this.shown.set(run, shown)
    if (nowMs - shown.levelsAtMs >= LEVELS_EVERY_MS || nowMs < shown.levelsAtMs) {
      shown.levelsAtMs = nowMs
      this.events.emit('levels', run)
    }
    const change = run.method.changeCount(run.state)
    if (change !== shown.change) {
      shown.change = change
      this.events.emit('changed', run)
    }
  }

  private commitWhenDue(run: OpenRun): void {
    const segmentFrames = SEGMENT_MS / run.row.setup.frameMs
    if (run.committing || run.buffer.frames < segmentFrames) return
    run.committing = true
    void run.storing.add(async () => {
      await this.commit(run, segmentFrames)
      run.committing = false
    })
  }

  private async commit(run: OpenRun, frames: number): Promise<void> {
    const segment = run.buffer.pack(run.segmentNo, run.committed, frames)
    const stored = await this.untilStored(run, () =>
      insertSegment(this.deps.knex, run.row.seq, segment, this.deps.now()),
    )
    if (!stored) return
    run.segmentNo++
    run.committed += frames
    run.buffer.drop(frames, run.committed)
    this.events.emit('committed', run)
  }

  private endWhenFinished(run: OpenRun): void {
    if (run.ending) return
    if (run.fault) {
      this.deps.log.error({ err: run.fault, run: run.row.id }, 'measuring failed, the trace is kept')
      this.end(run, 'interrupted', MEASURING_FAILED)
    } else if (run.method.isFinished(run.state)) this.end(run, 'sealed', null)
  }

  private end(run: OpenRun, status: 'sealed' | 'stopped' | 'interrupted', reason: string | null): void {
    if (run.ending) return
    run.storage = 'judgedNotStored'
    const measured = measuredOf(run)
    const shape = MeasuredRun.safeParse(measured)
    if (!shape.success) {
      // What cannot be read back is not stored as readings; the trace is, and the run can be computed again.
      this.deps.log.error({ err: shape.error, run: run.row.id }, 'readings do not have their shape')
      run.fault ??= shape.error
      run.measured = run.method.viewRun(run.method.startRun(run.row.setup))
    }
    run.ending = shape.success ? { status, reason } : { status: 'interrupted', reason: MEASURING_FAILED }
    this.events.emit('changed', run)
    void run.storing.add(() => this.seal(run))
  }

  private async seal(run: OpenRun): Promise<void> {
    const stored = await this.untilStored(run, () =>
      sealRun(this.deps.knex, run, run.measured, this.deps.now()),
    )
    if (!stored) return
    run.storage = 'stored'
    run.committed = run.next
    this.runs.delete(run.row.id)
    if (this.byBench.get(run.row.benchId) === run) this.byBench.delete(run.row.benchId)
    this.events.emit('ended', run)
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
    const nowMs = this.deps.now().getTime()
    for (const run of this.runs.values()) {
      if (run.ending || nowMs - run.lastHeardMs < this.deps.silenceMs) continue
      void run.queue.add(() => {
        if (this.deps.now().getTime() - run.lastHeardMs >= this.deps.silenceMs)
          this.end(run, 'interrupted', 'the bench fell silent')
      })
    }
  }
}

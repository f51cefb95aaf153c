import type { Knex } from 'knex'
import { METHOD, methods } from '../../src/shared/measure/method.ts'
import { isAllowed } from '../../src/shared/contract/permissions.ts'
import type { Person } from '../../src/shared/contract/auth.ts'
import type { MeasuredRun } from '../../src/shared/contract/measured.ts'
import type {
  RecomputeReport,
  RunActionRequest,
  RunSetup,
  RunStart,
  RunTrace,
  RunView,
} from '../../src/shared/contract/runs.ts'
import { insertAudit } from '../audit/audit.queries.ts'
import type { BenchHub } from '../bench/benchHub.ts'
import { isDuplicate } from '../connect.ts'
import { AppError } from '../errors.ts'
import { measuredOf } from './openRun.ts'
import type { OpenRun } from './openRun.ts'
import { recomputeRun } from './recomputeRun.ts'
import type { Actor, RunBoard } from './runBoard.ts'
import { viewOfOpenRun, viewOfRow } from './runView.ts'
import { findActions, findHolder, findRun, findSegments, hasAction, insertRun } from './runs.queries.ts'
import type { RunRow } from './runs.queries.ts'
import { RUNTIME } from './runtime.ts'
import {
  findBenchSetup,
  findOrInsertInstrument,
  findSheetInForce,
  findStartModel,
} from './startRun.queries.ts'
import { thinTrace } from './thinTrace.ts'
import { unpackTrace } from './traceSegment.ts'

export interface RunsDeps {
  knex: Knex
  board: RunBoard
  hub: BenchHub
  now: () => Date
  cautionsAcknowledged: (userId: string) => Promise<boolean>
}

export type RunsService = ReturnType<typeof createRunsService>

export function createRunsService(deps: RunsDeps) {
  const { knex, board, hub, now } = deps

  async function viewOf(id: string): Promise<RunView> {
    const open = board.find(id)
    if (open) return viewOfOpenRun(open, measuredOf(open), hub.isConnected(open.row.benchId))
    const row = await findRun(knex, id)
    if (!row) throw new AppError('run.unknown')
    return viewOfRow(
      row,
      row.measured ?? nothingMeasured(row),
      await findActions(knex, row.seq),
      hub.isConnected(row.benchId),
    )
  }

  function viewAfter(id: string, measured: MeasuredRun): Promise<RunView> | RunView {
    const open = board.find(id)
    return open ? viewOfOpenRun(open, measured, hub.isConnected(open.row.benchId)) : viewOf(id)
  }

  async function start(request: RunStart, person: Person): Promise<RunView> {
    const known = await startedBefore(request.id)
    if (known) return known
    if (!(await deps.cautionsAcknowledged(person.id))) throw new AppError('cautions.needed')
    const hello = hub.helloOf(request.benchId)
    const bench = await findBenchSetup(knex, request.benchId, now(), hello)
    if (!bench) throw new AppError('bench.unknown')
    if (!hello) throw new AppError('bench.offline', { facts: { bench: bench.name } })
    const model = await findStartModel(knex, request.serial, request.modelId)
    if (!model.isRecording && !request.conditions.controlsSet) throw controlsNotSet()
    const sheet = await findSheetInForce(knex, model.id, now())
    if (!sheet) throw new AppError('sheet.none-in-force', { facts: { model: model.name } })
    const channels = hello.channelKind === 'six' ? 6 : 1
    const setup: RunSetup = {
      method: METHOD,
      frameMs: hello.frameMs,
      channelKind: hello.channelKind,
      capabilities: hello.capabilities,
      algorithms: hello.algorithms,
      mainsHz: hello.mainsHz,
      benchClock: hello.wallClock,
      calibrationDb: resized(bench.calibrationDb, channels, 0),
      uCalOwnDb: bench.uCalOwnDb,
      uCalSharedDb: bench.uCalSharedDb,
      floorDb: resized(bench.floorDb, channels, UNVERIFIED_FLOOR_DB),
      studySDb: bench.studySDb,
      verified: bench.verificationId !== null,
      verificationId: bench.verificationId,
      conditions: request.conditions,
      model,
      sheet,
      person: person.name,
    }
    const row = await insertOpenRun(request, setup, person)
    const run = board.open(row)
    hub.startRun(run)
    return viewOfOpenRun(run, measuredOf(run), true)
  }

  /** A retry of a start whose answer was lost gives the same run. */
  async function startedBefore(id: string): Promise<RunView | null> {
    const run = board.find(id) ?? (await board.adopt(id))
    if (run) hub.startRun(run)
    if (run || (await findRun(knex, id))) return viewOf(id)
    return null
  }

  async function insertOpenRun(request: RunStart, setup: RunSetup, person: Person): Promise<RunRow> {
    const at = now()
    let instrumentId = ''
    try {
      await knex.transaction(async (trx) => {
        instrumentId = await findOrInsertInstrument(trx, request.serial, setup.model.id, at)
        await insertRun(trx, {
          id: request.id,
          instrumentId,
          benchId: request.benchId,
          openedBy: person.id,
          reason: request.reason,
          openedAt: at,
          runtime: RUNTIME,
          setup,
        })
        await insertAudit(
          trx,
          {
            userId: person.id,
            actor: person.name,
            action: 'run.opened',
            subject: 'run',
            subjectId: request.id,
            details: { serial: request.serial, reason: request.reason, sheet: setup.sheet.label },
          },
          at,
        )
      })
    } catch (error) {
      if (!isDuplicate(error)) throw error
      await explainLoser(request, instrumentId)
    }
    const row = await findRun(knex, request.id)
    if (!row) throw new Error('the run that was just stored cannot be read')
    return row
  }

  /** Two at once for one bench or one serial: the loser is told who and where; the same request twice is one run. */
  async function explainLoser(request: RunStart, instrumentId: string): Promise<void> {
    const onSerial = await findHolder(knex, { instrumentId })
    if (onSerial?.id === request.id) return
    if (onSerial) throw new AppError('run.serial-busy', { facts: factsOf(onSerial) })
    const onBench = await findHolder(knex, { benchId: request.benchId })
    if (onBench) throw new AppError('bench.busy', { facts: factsOf(onBench) })
    throw new AppError('record.exists')
  }

  /** The open run, or null when the action with this id is what it ended with: a retry is answered, not refused. */
  async function openOrActed(id: string, actionId: string): Promise<OpenRun | null> {
    const run = board.find(id) ?? (await board.adopt(id))
    if (run) return run
    const row = await findRun(knex, id)
    if (!row) throw new AppError('run.unknown')
    if (await hasAction(knex, row.seq, actionId)) return null
    throw new AppError('run.not-open')
  }

  return {
    read: viewOf,
    start,

    async act(id: string, request: RunActionRequest, person: Person): Promise<RunView> {
      const run = await openOrActed(id, request.id)
      if (!run) return viewOf(id)
      return viewAfter(id, await board.act(run, request.id, request.action, actorOf(person)))
    },

    async takeOver(id: string, request: { id: string; reason: string }, person: Person): Promise<RunView> {
      const run = await openOrActed(id, request.id)
      if (!run) return viewOf(id)
      return viewAfter(id, await board.takeOver(run, request.id, request.reason, actorOf(person)))
    },

    async trace(id: string, points: number): Promise<RunTrace> {
      const row = await findRun(knex, id)
      if (!row) throw new AppError('run.unknown')
      const open = board.find(id)
      const committed = open?.committed ?? 0
      let segments = await findSegments(knex, row.seq)
      // A segment that was committed while this was read would fall between the two halves.
      if (open && open.committed !== committed) segments = await findSegments(knex, row.seq)
      const { frames } = unpackTrace(segments)
      if (open) frames.push(...open.buffer.read().frames.slice(Math.max(0, frames.length - open.committed)))
      return {
        run: id,
        frameMs: row.setup.frameMs,
        ...thinTrace(frames, points),
        segments: segments.map((segment) => ({
          no: segment.no,
          fromFrame: segment.fromFrame,
          frames: segment.frames,
          sha256: segment.sha256.toString('hex'),
          bytes: segment.data.length,
        })),
      }
    },

    async recompute(id: string): Promise<RecomputeReport> {
      const row = await findRun(knex, id)
      if (!row) throw new AppError('run.unknown')
      if (row.status === 'open')
        throw new AppError('run.not-open', { detail: 'A run is computed again once it has ended.' })
      return recomputeRun(knex, row)
    },
  }
}

/** A run that could not be read back has trace and actions, and no readings. */
function nothingMeasured({ setup }: RunRow): MeasuredRun {
  const method = methods[setup.method]
  if (!method) throw new Error(`method ${setup.method} is not part of this program`)
  return method.viewRun(method.startRun(setup))
}

/** Without a verification nothing is known of a bench's floor; such a run gets no verdict anyway. */
const UNVERIFIED_FLOOR_DB = -120

function controlsNotSet(): AppError {
  const message = 'set volume full, tone flat, tuner off, then confirm it'
  return new AppError('request.invalid', { fields: [{ path: 'body.conditions.controlsSet', message }] })
}

function resized(values: readonly number[], length: number, filler: number): number[] {
  return Array.from({ length }, (_, i) => values[i] ?? filler)
}

function actorOf(person: Person): Actor {
  return { id: person.id, name: person.name, mayStopAny: isAllowed(person.roles, 'stopAnyRun') }
}

function factsOf(holder: { id: string; serial: string; person: string; benchName: string }) {
  return { runId: holder.id, serial: holder.serial, person: holder.person, bench: holder.benchName }
}

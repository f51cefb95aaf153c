import type { Logger } from 'pino'
import type { Namespace, Socket } from 'socket.io'
import { WatchBenches, WatchRun } from '../../src/shared/contract/live.ts'
import type { ScreenToServer, ServerToScreen } from '../../src/shared/contract/live.ts'
import type { RunView } from '../../src/shared/contract/runs.ts'
import type { BenchView } from '../../src/shared/contract/workshop.ts'
import { requireAccess } from '../auth/requireAccess.ts'
import type { Sessions } from '../auth/sessions.ts'
import { answering } from '../bench/answering.ts'
import type { BenchHub } from '../bench/benchHub.ts'
import type { Config } from '../config.ts'
import { AppError, problemOf } from '../errors.ts'
import { isOwnOrigin } from '../http/origin.ts'
import { measuredOf, takeLevels } from '../runs/openRun.ts'
import type { OpenRun } from '../runs/openRun.ts'
import type { RunBoard } from '../runs/runBoard.ts'
import { viewOfOpenRun } from '../runs/runView.ts'

interface ScreenData {
  sessionId: string
}

export type LiveNamespace = Namespace<ScreenToServer, ServerToScreen, Record<string, never>, ScreenData>

export interface LiveGatewayDeps {
  log: Logger
  sessions: Sessions
  hub: BenchHub
  board: RunBoard
  readRun: (id: string) => Promise<RunView>
  readBenches: () => Promise<BenchView[]>
  config: Pick<Config, 'publicUrl'>
  refused: (code: string) => void
}

const BENCHES_ROOM = 'benches'
/** A view after each change, but not more often than this; the last one always comes. */
const VIEW_EVERY_MS = 100

/** Screens: the whole state first, then every change; levels may be skipped where a screen is slow. */
export function openLiveGateway(namespace: LiveNamespace, deps: LiveGatewayDeps): void {
  const { sessions, board, hub } = deps

  namespace.use((socket, next) => {
    identify(socket, deps)
      .then((sessionId) => {
        socket.data.sessionId = sessionId
        next()
      })
      .catch((error: unknown) => {
        const problem = problemOf(error)
        deps.refused(problem.code)
        next(Object.assign(new Error(problem.code), { data: problem }))
      })
  })

  namespace.on('connection', (socket) => {
    const on = answering(socket, { log: deps.log, refused: deps.refused }, 'session:refused')
    void socket.join(sessionRoom(socket.data.sessionId))

    const allowed = async () => {
      // The cookie of a long-lived socket grows old; its session is what counts.
      requireAccess('read', await sessions.personOfSession(socket.data.sessionId))
    }

    on('watch:run', WatchRun, async ({ run }) => {
      await allowed()
      const isFirst = !namespace.adapter.rooms.has(runRoom(run))
      // Joined first, so that an end in between is not missed; a run that is unknown has no room to stay in.
      await socket.join(runRoom(run))
      const view = await deps.readRun(run).catch(async (error: unknown) => {
        await socket.leave(runRoom(run))
        throw error
      })
      // What the first of a room was sent as a whole is not told again piece by piece.
      if (isFirst && board.find(run)) told.set(run, view.measured.plucks.length)
      return { view }
    })
    on('unwatch:run', WatchRun, async ({ run }) => {
      await socket.leave(runRoom(run))
      return {}
    })
    on('watch:benches', WatchBenches, async () => {
      await allowed()
      await socket.join(BENCHES_ROOM)
      return { benches: await deps.readBenches() }
    })
  })

  sessions.onEnded((sessionIds) => {
    const rooms = namespace.in(sessionIds.map(sessionRoom))
    rooms.emit('session:ended', problemOf(new AppError('sign-in.required')))
    rooms.disconnectSockets(true)
  })

  const watched = (run: OpenRun) => (namespace.adapter.rooms.get(runRoom(run.row.id))?.size ?? 0) > 0
  /** runs whose last view is younger than VIEW_EVERY_MS; true: something changed since */
  const due = new Map<string, boolean>()
  /** plucks that the run's room was told of */
  const told = new Map<string, number>()

  const publish = (run: OpenRun) => {
    const view = viewOfOpenRun(run, measuredOf(run), hub.isConnected(run.row.benchId))
    const room = namespace.to(runRoom(run.row.id))
    for (const pluck of view.measured.plucks.slice(told.get(run.row.id) ?? 0))
      room.emit('run:pluck', { run: run.row.id, stringNo: pluck.stringNo, pluck })
    told.set(run.row.id, view.measured.plucks.length)
    room.emit('run:view', view)
  }

  const publishSoon = (run: OpenRun) => {
    const id = run.row.id
    if (due.has(id)) {
      due.set(id, true)
      return
    }
    publish(run)
    due.set(id, false)
    setTimeout(() => {
      const changed = due.get(id)
      due.delete(id)
      if (changed) publishSoon(run)
    }, VIEW_EVERY_MS).unref()
  }

  board.events.on('changed', (run) => {
    if (watched(run)) publishSoon(run)
  })
  board.events.on('levels', (run) => {
    const levels = takeLevels(run)
    if (levels && watched(run)) namespace.to(runRoom(run.row.id)).volatile.emit('run:levels', levels)
  })
  board.events.on('ended', (run) => {
    due.delete(run.row.id)
    publish(run)
    told.delete(run.row.id)
    announceBench(run.row.benchId)
  })
  hub.events.on('changed', (benchId) => announceBench(benchId))

  function announceBench(benchId: string): void {
    if (!namespace.adapter.rooms.has(BENCHES_ROOM)) return
    deps
      .readBenches()
      .then((benches) => {
        const bench = benches.find((candidate) => candidate.id === benchId)
        if (bench) namespace.to(BENCHES_ROOM).emit('bench:view', bench)
      })
      .catch((error: unknown) => deps.log.warn({ err: error }, 'screens could not be told of a bench'))
  }
}

async function identify(socket: Socket, deps: LiveGatewayDeps): Promise<string> {
  const { headers } = socket.handshake
  if (!isOwnOrigin(headers, deps.config)) throw new AppError('request.origin')
  const signedIn = await deps.sessions.personOfCookies(headers.cookie)
  if (!signedIn) throw new AppError('sign-in.required')
  return signedIn.sessionId
}

function runRoom(id: string): string {
  return `run:${id}`
}

function sessionRoom(id: string): string {
  return `session:${id}`
}

import type { Logger } from 'pino'
import type { Namespace, Socket } from 'socket.io'
import { WatchBenches, WatchRun } from '../../src/shared/contract/live.ts'
import type { ScreenToServer, ServerToScreen } from '../../src/shared/contract/live.ts'
import type { MeasuredRun } from '../../src/shared/contract/measured.ts'
import type { RunView } from '../../src/shared/contract/runs.ts'
import type { BenchView } from '../../src/shared/contract/workshop.ts'
import { requireAccess } from '../auth/requireAccess.ts'
import type { Sessions } from '../auth/sessions.ts'
import { answering } from '../bench/answering.ts'
import type { BenchHub } from '../bench/benchHub.ts'
import type { Config } from '../config.ts'
import { AppError, problemOf } from '../errors.ts'
import { isOwnOrigin } from '../http/origin.ts'
import { takeLevels } from '../runs/openRun.ts'
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
      const view = await deps.readRun(run)
      await socket.join(runRoom(run))
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
  const due = new Map<string, { measured: MeasuredRun; timer: NodeJS.Timeout | null }>()
  const publish = (run: OpenRun, measured: MeasuredRun) => {
    namespace
      .to(runRoom(run.row.id))
      .emit('run:view', viewOfOpenRun(run, measured, hub.isConnected(run.row.benchId)))
  }

  const plucks = new Map<string, number>()
  board.events.on('changed', (run, measured) => {
    const id = run.row.id
    const told = plucks.get(id) ?? 0
    plucks.set(id, measured.plucks.length)
    if (!watched(run)) return
    for (const pluck of measured.plucks.slice(told))
      namespace.to(runRoom(id)).emit('run:pluck', { run: id, stringNo: pluck.stringNo, pluck })
    const waiting = due.get(id)
    if (waiting) {
      waiting.measured = measured
      return
    }
    publish(run, measured)
    const entry = { measured, timer: null as NodeJS.Timeout | null }
    entry.timer = setTimeout(() => {
      due.delete(id)
      if (entry.measured !== measured) publish(run, entry.measured)
    }, VIEW_EVERY_MS)
    due.set(id, entry)
  })
  board.events.on('levels', (run) => {
    const levels = takeLevels(run)
    if (levels && watched(run)) namespace.to(runRoom(run.row.id)).volatile.emit('run:levels', levels)
  })
  board.events.on('ended', (run, measured) => {
    const waiting = due.get(run.row.id)
    if (waiting?.timer) clearTimeout(waiting.timer)
    due.delete(run.row.id)
    plucks.delete(run.row.id)
    publish(run, measured)
  })
  hub.events.on('changed', (benchId) => announceBench(benchId))
  board.events.on('ended', (run) => announceBench(run.row.benchId))

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

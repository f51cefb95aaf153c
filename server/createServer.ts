import { createServer as createHttpServer } from 'node:http'
import type { Server as HttpServer } from 'node:http'
import type { Knex } from 'knex'
import type { Logger } from 'pino'
import { Server } from 'socket.io'
import { BENCH_NAMESPACE } from '../src/shared/contract/frames.ts'
import { LIVE_NAMESPACE } from '../src/shared/contract/live.ts'
import { METHOD } from '../src/shared/measure/method.ts'
import { createApp } from './app.ts'
import { createPasswords } from './auth/passwords.ts'
import { createSessions } from './auth/sessions.ts'
import { openBenchGateway } from './bench/bench.gateway.ts'
import type { BenchNamespace } from './bench/bench.gateway.ts'
import { BenchHub } from './bench/benchHub.ts'
import { protocolSchema } from './bench/protocolSchema.ts'
import { listBenches } from './benches/benches.queries.ts'
import { isAcknowledged } from './cautions/cautions.service.ts'
import type { Config } from './config.ts'
import { createHandlers } from './handlers.ts'
import { openLiveGateway } from './live/live.gateway.ts'
import type { LiveNamespace } from './live/live.gateway.ts'
import { RunBoard } from './runs/runBoard.ts'
import { createRunsHandlers } from './runs/runs.handlers.ts'
import { createRunsService } from './runs/runs.service.ts'

/** Of the program; package.json says the same. */
const VERSION = '0.1.0'

/** Larger than any batch that keeps to the window; what is larger ends the connection. */
const MAX_MESSAGE_BYTES = 512 * 1024

export interface RunningServer {
  http: HttpServer
  board: RunBoard
  hub: BenchHub
  /** refusals over sockets since the start, by code */
  refusals: ReadonlyMap<string, number>
  close: () => Promise<void>
}

/** Everything built and wired, open runs restored; it does not listen yet. */
export async function createServer(deps: {
  config: Config
  knex: Knex
  log: Logger
  now?: () => Date
  /** ms on a clock that is never set */
  elapsedMs?: () => number
}): Promise<RunningServer> {
  const { config, knex, log, now = () => new Date(), elapsedMs = () => performance.now() } = deps
  const refusals = new Map<string, number>()
  const refused = (code: string) => void refusals.set(code, (refusals.get(code) ?? 0) + 1)

  const passwords = createPasswords(config)
  const sessions = createSessions(knex, config, now)
  const hub = new BenchHub()
  const board = new RunBoard({ knex, log, now, elapsedMs, silenceMs: config.benchSilenceSeconds * 1000 })
  const runs = createRunsService({
    knex,
    board,
    hub,
    now,
    cautionsAcknowledged: (userId) => isAcknowledged(knex, config, userId, now()),
  })
  const handlers = createHandlers({
    config,
    knex,
    sessions,
    passwords,
    hub,
    runs: createRunsHandlers(knex, runs),
    protocolSchema: protocolSchema(),
    about: { method: METHOD, version: VERSION },
    now,
  })
  const http = createHttpServer(createApp({ config, handlers, sessions, log }))
  const io = new Server(http, {
    transports: ['websocket'],
    maxHttpBufferSize: MAX_MESSAGE_BYTES,
    serveClient: false,
    pingInterval: 10_000,
    pingTimeout: 10_000,
  })
  openBenchGateway(io.of(BENCH_NAMESPACE) as BenchNamespace, { knex, log, hub, board, now, refused })
  openLiveGateway(io.of(LIVE_NAMESPACE) as LiveNamespace, {
    log,
    sessions,
    hub,
    board,
    readRun: runs.read,
    readBenches: () => listBenches(knex, hub, now()),
    config,
    refused,
  })
  const restored = await board.restore()
  if (restored > 0) log.info({ runs: restored }, 'open runs restored')

  return {
    http,
    board,
    hub,
    refusals,
    close: async () => {
      await io.close()
      await board.close()
      await passwords.close()
    },
  }
}

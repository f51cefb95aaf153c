import { createHash } from 'node:crypto'
import type { Knex } from 'knex'
import type { Logger } from 'pino'
import type { Namespace } from 'socket.io'
import { BenchHello, BenchVerify, FrameBatch, PROTOCOL_VERSION } from '../../src/shared/contract/frames.ts'
import type { BenchToServer, ServerToBench } from '../../src/shared/contract/frames.ts'
import { AppError, problemOf } from '../errors.ts'
import type { RunBoard } from '../runs/runBoard.ts'
import { answering } from './answering.ts'
import { orderOf, WINDOW_FRAMES } from './benchHub.ts'
import type { BenchHub, BenchSocket } from './benchHub.ts'
import { findBenchByToken, findCalibration, findVerification, touchBench } from './bench.queries.ts'
import { verifyFromBench } from './verifyFromBench.ts'

export interface BenchGatewayDeps {
  knex: Knex
  log: Logger
  hub: BenchHub
  board: RunBoard
  now: () => Date
  refused: (code: string) => void
}

export type BenchNamespace = Namespace<
  BenchToServer,
  ServerToBench,
  Record<string, never>,
  { benchId: string }
>

/** Benches: the token is checked before the connection stands; frames go to the run that is open on the bench. */
export function openBenchGateway(namespace: BenchNamespace, deps: BenchGatewayDeps): void {
  const { knex, hub, board, now } = deps

  namespace.use((socket, next) => {
    identify(knex, socket.handshake.auth as unknown)
      .then((benchId) => {
        socket.data.benchId = benchId
        next()
      })
      .catch((error: unknown) => {
        const problem = problemOf(error)
        deps.refused(problem.code)
        next(Object.assign(new Error(problem.code), { data: problem }))
      })
  })

  namespace.on('connection', (socket: BenchSocket) => {
    const { benchId } = socket.data
    const log = deps.log.child({ bench: benchId })
    const on = answering(socket, { log, refused: deps.refused }, 'bench:refused')
    let greeted = false
    let inFlight = false
    hub.connect(benchId, socket)
    socket.on('disconnect', () => {
      hub.disconnect(benchId, socket)
      board.benchChanged(benchId)
    })

    on('bench:hello', BenchHello, async (hello) => {
      if (hello.protocolVersion !== PROTOCOL_VERSION)
        throw new AppError('protocol.version', { facts: { spoken: PROTOCOL_VERSION } })
      const bench = await touchBench(knex, benchId, hello, now())
      const verification = await findVerification(knex, benchId, now(), hello)
      hub.greet(benchId, socket, hello)
      greeted = true
      const run = board.onBench(benchId)
      board.benchChanged(benchId)
      if (run) queueMicrotask(() => hub.prompt(run))
      return {
        benchId,
        name: bench.name,
        verified: verification !== null,
        verifiedUntil: verification?.validUntil.toISOString() ?? null,
        order: run && !run.ending ? orderOf(run) : null,
      }
    })

    on('bench:frames', FrameBatch, async (batch) => {
      if (!greeted) throw new AppError('protocol.hello-first')
      if (inFlight) throw new AppError('frames.in-flight')
      const run = board.onBench(benchId)
      if (!run || run.row.id !== batch.run)
        throw new AppError(run ? 'frames.foreign' : 'run.not-open', { facts: { run: run?.row.id ?? null } })
      inFlight = true
      try {
        return { ...(await board.takeFrames(run, batch)), window: WINDOW_FRAMES }
      } finally {
        inFlight = false
      }
    })

    on('bench:verify', BenchVerify, async (measured) => {
      const hello = hub.helloOf(benchId)
      if (!hello) throw new AppError('protocol.hello-first')
      const { channelKind, capabilities, algorithms } = hello
      const calibrationDb = await findCalibration(knex, benchId)
      const bench = { id: benchId, channelKind, capabilities, algorithms, calibrationDb }
      const answer = await verifyFromBench(knex, bench, measured, now())
      hub.events.emit('changed', benchId)
      return answer
    })
  })

  hub.events.on('changed', (benchId) => board.benchChanged(benchId))
  board.events.on('changed', (run) => hub.prompt(run))
  board.events.on('committed', (run) => hub.committed(run))
  board.events.on('ended', (run) => hub.ended(run))
}

async function identify(knex: Knex, auth: unknown): Promise<string> {
  const token = (auth as { token?: unknown } | null)?.token
  if (typeof token !== 'string' || token.length < 20 || token.length > 200) throw new AppError('bench.token')
  const benchId = await findBenchByToken(knex, createHash('sha256').update(token).digest())
  if (!benchId) throw new AppError('bench.token')
  return benchId
}

import { createHash } from 'node:crypto'
import type { Knex } from 'knex'
import type { Logger } from 'pino'
import type { Namespace } from 'socket.io'
import { BenchHello, BenchVerify, FrameBatch, PROTOCOL_VERSION } from '../../src/shared/contract/frames.ts'
import type { BenchToServer, ServerToBench } from '../../src/shared/contract/frames.ts'
import { AppError, problemOf } from '../errors.ts'
import type { OpenRun } from '../runs/openRun.ts'
import type { RunBoard } from '../runs/runBoard.ts'
import { answering } from './answering.ts'
import { orderOf, WINDOW_FRAMES } from './benchHub.ts'
import type { BenchHub, BenchSocket } from './benchHub.ts'
import {
  findBenchByToken,
  findCalibration,
  findOutcome,
  findVerification,
  touchBench,
} from './bench.queries.ts'
import { differencesOf } from './benchSetup.ts'
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
    const refuse = (error: unknown): void => {
      const problem = problemOf(error)
      deps.refused(problem.code)
      next(Object.assign(new Error(problem.code), { data: problem }))
    }
    const accept = (benchId: string): void => {
      socket.data.benchId = benchId
      next()
    }
    identify(knex, socket.handshake.auth as unknown)
      .then(accept, refuse)
      .catch((error: unknown) => deps.log.error({ err: error }, 'a bench could not be let in'))
  })

  namespace.on('connection', (socket: BenchSocket) => {
    const { benchId } = socket.data
    const log = deps.log.child({ bench: benchId })
    const on = answering(socket, { log, refused: deps.refused }, 'bench:refused')
    let greeting: BenchHello | null = null
    let inFlight = false

    /** What nobody waits for: a fault there is logged and goes no further. */
    const quietly = (work: () => void): void => {
      try {
        work()
      } catch (error) {
        log.error({ err: error }, 'a bench could not be told')
      }
    }

    /** The run that takes this bench's frames; one that is open and not measured here is taken up again. */
    const runFor = async (held: string | null): Promise<OpenRun | null> => {
      const there = board.onBench(benchId)
      if (there || held === null) return there ?? null
      if ((await findOutcome(knex, benchId, held)) !== 'open') return board.onBench(benchId) ?? null
      await board.adopt(held)
      return board.onBench(benchId) ?? null
    }

    /** A bench forgets what it holds only when it is told that the run has ended. */
    const tellEnd = async (runId: string): Promise<void> => {
      const end = await findOutcome(knex, benchId, runId)
      if (end === 'open' || board.find(runId)) return
      // A run that is not there takes no frames either.
      const { outcome, verdict } = end ?? { outcome: 'interrupted', verdict: null }
      setImmediate(() => quietly(() => hub.endedBefore(benchId, { run: runId, outcome, verdict })))
    }

    quietly(() => hub.connect(benchId, socket))
    socket.on('disconnect', () =>
      quietly(() => {
        hub.disconnect(benchId, socket)
        board.benchChanged(benchId)
      }),
    )

    on('bench:hello', BenchHello, async (hello) => {
      greeting = null
      if (hello.protocolVersion !== PROTOCOL_VERSION)
        throw new AppError('protocol.version', { facts: { spoken: PROTOCOL_VERSION } })
      const held = hello.holding?.run ?? null
      const run = await runFor(held)
      try {
        refuseOther(run, hello)
      } catch (error) {
        hub.ungreet(benchId, socket)
        throw error
      }
      const bench = await touchBench(knex, benchId, hello, now())
      const verification = await findVerification(knex, benchId, now(), hello)
      if (held !== null && held !== run?.row.id) await tellEnd(held)
      hub.greet(benchId, socket, hello)
      greeting = hello
      board.benchChanged(benchId)
      // After the answer, which brings the order that the prompt belongs to.
      if (run) setImmediate(() => quietly(() => hub.prompt(run)))
      return {
        benchId,
        name: bench.name,
        verified: verification !== null,
        verifiedUntil: verification?.validUntil.toISOString() ?? null,
        order: run && !run.ending ? orderOf(run) : null,
      }
    })

    on('bench:frames', FrameBatch, async (batch) => {
      if (!greeting) throw new AppError('protocol.hello-first')
      if (inFlight) throw new AppError('frames.in-flight')
      inFlight = true
      try {
        const run = board.onBench(benchId) ?? (await runFor(batch.run))
        if (!run) {
          await tellEnd(batch.run)
          throw new AppError('run.not-open', { facts: { run: null } })
        }
        if (run.row.id !== batch.run) throw new AppError('frames.foreign', { facts: { run: run.row.id } })
        refuseOther(run, greeting)
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

/** Frames of another set-up cannot be measured as the run began: nothing of it is mixed into the trace. */
function refuseOther(run: OpenRun | null, hello: BenchHello): void {
  if (!run || run.ending) return
  const differs = differencesOf(hello, run.row.setup)
  if (differs.length > 0)
    throw new AppError('bench.differs', { facts: { run: run.row.id, differs: differs.join(', ') } })
}

async function identify(knex: Knex, auth: unknown): Promise<string> {
  const token = (auth as { token?: unknown } | null)?.token
  if (typeof token !== 'string' || token.length < 20 || token.length > 200) throw new AppError('bench.token')
  const benchId = await findBenchByToken(knex, createHash('sha256').update(token).digest())
  if (!benchId) throw new AppError('bench.token')
  return benchId
}

import { createServer } from 'node:http'
import type { AddressInfo } from 'node:net'
import { Server } from 'socket.io'
import type { Socket } from 'socket.io'
import { ERRORS } from '../../src/shared/contract/errors.ts'
import type { ErrorCode, Problem } from '../../src/shared/contract/errors.ts'
import { BENCH_NAMESPACE, BenchHello, BenchVerify, FrameBatch } from '../../src/shared/contract/frames.ts'
import type {
  BenchToServer,
  FramesAnswer,
  HelloAnswer,
  RunOrder,
  ServerToBench,
  VerifyAnswer,
} from '../../src/shared/contract/frames.ts'
import { makeArrivals } from './arrivals.ts'
import type { Arrivals } from './arrivals.ts'

export type ServerSocket = Socket<BenchToServer, ServerToBench>

/** A batch that has arrived and waits for its answer. */
export interface ArrivedBatch {
  batch: FrameBatch
  answer: (answer: FramesAnswer) => void
  accept: (more?: { committed?: number; window?: number }) => void
}

/** A server that speaks the bench protocol only as far as a test tells it to; every message must fit the contract. */
export interface FakeBenchServer {
  url: string
  connections: Arrivals<{ socket: ServerSocket; auth: unknown; address: string }>
  hellos: Arrivals<BenchHello>
  verifies: Arrivals<BenchVerify>
  batches: Arrivals<ArrivedBatch>
  answerHello: () => HelloAnswer
  answerVerify: () => VerifyAnswer
  /** refuse connections with this code */
  refuseWith: ErrorCode | null
  socket: () => ServerSocket
  close: () => Promise<void>
}

export function problem(code: ErrorCode, facts?: Problem['facts']): Problem {
  return { type: `urn:evenstrung:${code}`, code, ...ERRORS[code], status: 400, ...(facts ? { facts } : {}) }
}

export function helloAnswer(
  more: { verified?: boolean; verifiedUntil?: string; order?: RunOrder | null } = {},
): HelloAnswer {
  return {
    ok: true,
    benchId: '7d2c1a52-5b8a-4f43-9a3e-6f0c5b1d2e01',
    name: 'Window',
    verified: true,
    verifiedUntil: '2026-12-09T08:00:00.000Z',
    order: null,
    ...more,
  }
}

export async function startFakeBenchServer(): Promise<FakeBenchServer> {
  const http = createServer()
  const io = new Server(http, { transports: ['websocket'] })
  const namespace = io.of(BENCH_NAMESPACE)
  let latest: ServerSocket | null = null

  const fake: FakeBenchServer = {
    url: '',
    connections: makeArrivals(),
    hellos: makeArrivals(),
    verifies: makeArrivals(),
    batches: makeArrivals(),
    answerHello: () => helloAnswer(),
    answerVerify: () => ({ ok: true, passed: true, validUntil: '2026-12-09T08:00:00.000Z', reasons: [] }),
    refuseWith: null,
    socket: () => latest!,
    close: () => new Promise((resolve) => void io.close(() => resolve())),
  }

  namespace.use((_, next) => {
    const code = fake.refuseWith
    next(code ? Object.assign(new Error(code), { data: problem(code) }) : undefined)
  })
  namespace.on('connection', (socket: ServerSocket) => {
    latest = socket
    fake.connections.push({ socket, auth: socket.handshake.auth, address: socket.handshake.url })
    socket.on('bench:hello', (message, answer) => {
      const hello = BenchHello.parse(message)
      answer(fake.answerHello())
      fake.hellos.push(hello)
    })
    socket.on('bench:verify', (message, answer) => {
      const verify = BenchVerify.parse(message)
      answer(fake.answerVerify())
      fake.verifies.push(verify)
    })
    socket.on('bench:frames', (message, answer) => {
      const batch = FrameBatch.parse(message)
      const accept = (more: { committed?: number; window?: number } = {}): void => {
        answer({ ok: true, next: batch.from + batch.frames.length, committed: 0, window: 200, ...more })
      }
      fake.batches.push({ batch, answer, accept })
    })
  })
  await new Promise<void>((resolve) => http.listen(0, '127.0.0.1', resolve))
  fake.url = `http://127.0.0.1:${(http.address() as AddressInfo).port}`
  return fake
}

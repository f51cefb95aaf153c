import { EventEmitter } from 'node:events'
import type { Socket } from 'socket.io'
import { z } from 'zod'
import { Problem } from '../../src/shared/contract/errors.ts'
import type {
  BenchHello,
  BenchToServer,
  RunEnded,
  RunOrder,
  RunPrompt,
  ServerToBench,
} from '../../src/shared/contract/frames.ts'
import type { SimulationCommand } from '../../src/shared/contract/simulation.ts'
import { noiseStretchMsOf } from '../../src/shared/measure/runState.ts'
import { AppError, problemOf } from '../errors.ts'
import type { OpenRun } from '../runs/openRun.ts'

export type BenchSocket = Socket<BenchToServer, ServerToBench, Record<string, never>, { benchId: string }>

interface Connection {
  socket: BenchSocket
  hello: BenchHello | null
}

const SIMULATE_TIMEOUT_MS = 3000
const SimulateAnswer = z.union([
  z.object({ ok: z.literal(true) }),
  z.object({ ok: z.literal(false), problem: Problem }),
])
/** Frames in a batch: the server sets it, the bench keeps to it. */
export const WINDOW_FRAMES = 200

/** Which benches are connected, and the messages that go to them. */
export class BenchHub {
  readonly events = new EventEmitter<{ changed: [benchId: string] }>()
  private readonly connections = new Map<string, Connection>()
  private readonly prompts = new Map<string, string>()

  /** The newest connection of a bench wins; the older one is told and stays away. */
  connect(benchId: string, socket: BenchSocket): void {
    const older = this.connections.get(benchId)
    this.connections.set(benchId, { socket, hello: null })
    this.prompts.delete(benchId)
    if (older) {
      older.socket.emit('bench:replaced', problemOf(new AppError('bench.replaced')))
      older.socket.disconnect(true)
    }
  }

  disconnect(benchId: string, socket: BenchSocket): void {
    if (this.connections.get(benchId)?.socket !== socket) return
    this.connections.delete(benchId)
    this.prompts.delete(benchId)
    this.events.emit('changed', benchId)
  }

  greet(benchId: string, socket: BenchSocket, hello: BenchHello): void {
    const connection = this.connections.get(benchId)
    if (connection?.socket !== socket) throw new AppError('bench.replaced')
    connection.hello = hello
    this.events.emit('changed', benchId)
  }

  /** A hello that was refused takes the place of one that was not: the bench is not ready any more. */
  ungreet(benchId: string, socket: BenchSocket): void {
    const connection = this.connections.get(benchId)
    if (connection?.socket !== socket || !connection.hello) return
    connection.hello = null
    this.events.emit('changed', benchId)
  }

  isConnected(benchId: string): boolean {
    return this.helloOf(benchId) !== null
  }

  helloOf(benchId: string): BenchHello | null {
    return this.connections.get(benchId)?.hello ?? null
  }

  startRun(run: OpenRun): void {
    this.connections.get(run.row.benchId)?.socket.emit('run:start', orderOf(run))
    this.prompt(run)
  }

  /** What the bench may show, or its automatic hand follows; sent when it changes. */
  prompt(run: OpenRun): void {
    const { prompt, stringNo } = run.method.promptOf(run.state)
    const message: RunPrompt = { run: run.row.id, phase: run.method.phaseOf(run.state), prompt, stringNo }
    const key = JSON.stringify(message)
    if (this.prompts.get(run.row.benchId) === key) return
    const socket = this.connections.get(run.row.benchId)?.socket
    if (!socket) return
    this.prompts.set(run.row.benchId, key)
    socket.emit('run:prompt', message)
  }

  committed(run: OpenRun): void {
    this.connections
      .get(run.row.benchId)
      ?.socket.emit('run:committed', { run: run.row.id, committed: run.committed })
  }

  ended(run: OpenRun): void {
    this.prompts.delete(run.row.benchId)
    this.connections.get(run.row.benchId)?.socket.emit('run:ended', {
      run: run.row.id,
      outcome: run.ending?.status ?? 'interrupted',
      verdict: run.measured.verdict,
    })
    this.events.emit('changed', run.row.benchId)
  }

  /** Of a run that ended while the bench was away. */
  endedBefore(benchId: string, message: RunEnded): void {
    this.connections.get(benchId)?.socket.emit('run:ended', message)
  }

  async simulate(benchId: string, command: SimulationCommand): Promise<void> {
    const connection = this.connections.get(benchId)
    if (!connection) throw new AppError('bench.offline')
    const answer: unknown = await connection.socket
      .timeout(SIMULATE_TIMEOUT_MS)
      .emitWithAck('bench:simulate', command)
      .catch(() => null)
    const parsed = SimulateAnswer.safeParse(answer)
    if (!parsed.success) throw new AppError('bench.offline')
    if (!parsed.data.ok) throw new AppError(parsed.data.problem.code, { detail: parsed.data.problem.detail })
  }

  /** Cuts a bench off, for example when its token was replaced. */
  cut(benchId: string): void {
    this.connections.get(benchId)?.socket.disconnect(true)
  }
}

export function orderOf(run: OpenRun): RunOrder {
  const { setup } = run.row
  return {
    run: run.row.id,
    serial: run.row.serial,
    from: run.next,
    window: WINDOW_FRAMES,
    noiseStretchMs: noiseStretchMsOf(setup),
    expectedHz: setup.model.tuning.map((pitch) => pitch.pitchesHz),
    circuit: setup.model.circuit,
  }
}

import { ERRORS } from '../../src/shared/contract/errors.ts'
import type { ErrorCode, Problem } from '../../src/shared/contract/errors.ts'
import { PROTOCOL_VERSION, RunOrder, RunPrompt } from '../../src/shared/contract/frames.ts'
import type { BenchAnswer, BenchHello, FramesAnswer, HelloAnswer } from '../../src/shared/contract/frames.ts'
import { SimulationCommand } from '../../src/shared/contract/simulation.ts'
import type { BenchSource } from '../sources/source.ts'
import { BenchConnection } from './benchConnection.ts'
import type { BenchSocket } from './benchConnection.ts'
import { systemClock } from './clock.ts'
import type { Clock } from './clock.ts'
import { makeFrameRun } from './frameRun.ts'
import type { FrameRun } from './frameRun.ts'

export interface BenchClientOptions {
  /** address of the server, without the namespace */
  url: string
  token: string
  source: BenchSource
  clock?: Clock
  log?: (line: string) => void
  /** a batch each so many ms */
  batchMs?: number
  answerTimeoutMs?: number
  backoffMs?: { first: number; most: number }
  /** 0..1, spreads the waiting of many benches */
  jitter?: () => number
  mostHeldFrames?: number
  /** called once when a newer connection took over: the client has given up */
  onReplaced?: () => void
}

export type BenchClientState = 'stopped' | 'connecting' | 'ready' | 'waiting' | 'replaced'

export interface BenchClient {
  start(): void
  stop(): void
  state(): BenchClientState
  /** refusals so far, by code */
  refusals(): ReadonlyMap<string, number>
  /** the run that frames are held of */
  runId(): string | null
}

const RETRY_MS = 1000
/** A verification is renewed when it ends within this time and no run is open, ms. */
const RENEW_BEFORE_MS = 3_600_000
const MOST_REFUSALS_IN_A_ROW = 5

/** Speaks for a source to the server: hello, verification, frames in batches, and all that can go wrong between. */
export function createBenchClient(options: BenchClientOptions): BenchClient {
  return new Client(options)
}

class Client implements BenchClient {
  private readonly options: BenchClientOptions
  private readonly source: BenchSource
  private readonly clock: Clock
  private readonly answerTimeoutMs: number
  private readonly connection: BenchConnection
  private readonly refusalCounts = new Map<string, number>()
  private now: BenchClientState = 'stopped'
  private run: FrameRun | null = null
  private prompt: RunPrompt | null = null
  private inFlight = false
  private verifying = false
  private holdSendingUntilMs = 0
  private refusedInARow = 0
  private verifiedUntil: string | null = null
  private lastTickMs = 0
  private cancelTick: () => void = () => undefined

  constructor(options: BenchClientOptions) {
    this.options = options
    this.source = options.source
    this.clock = options.clock ?? systemClock
    this.answerTimeoutMs = options.answerTimeoutMs ?? 10_000
    this.connection = new BenchConnection({
      url: options.url,
      token: options.token,
      clock: this.clock,
      backoffMs: options.backoffMs ?? { first: 250, most: 10_000 },
      jitter: options.jitter ?? Math.random,
      log: (line) => this.log(line),
      refused: (problem, of) => this.refused(problem, of),
      opened: (socket, current) => {
        this.now = 'connecting'
        this.listen(socket, current)
      },
      connected: (socket) => this.hello(socket),
      lost: () => {
        this.now = 'waiting'
        this.inFlight = false
        this.verifying = false
        this.source.serverSeen?.(false)
      },
    })
  }

  start(): void {
    if (this.now !== 'stopped') return
    this.lastTickMs = this.clock.nowMs()
    this.connection.open()
    this.tick()
  }

  stop(): void {
    this.cancelTick()
    this.connection.close()
    this.now = 'stopped'
  }

  state(): BenchClientState {
    return this.now
  }

  refusals(): ReadonlyMap<string, number> {
    return this.refusalCounts
  }

  runId(): string | null {
    return this.run?.id ?? null
  }

  private log(line: string): void {
    this.options.log?.(line)
  }

  private refused(problem: Problem, of: string): void {
    this.refusalCounts.set(problem.code, (this.refusalCounts.get(problem.code) ?? 0) + 1)
    this.log(`${of} was refused (${problem.code}): ${problem.title} ${problem.remedy}`)
  }

  private listen(socket: BenchSocket, current: () => boolean): void {
    socket.on('run:start', (message) => {
      const order = RunOrder.safeParse(message)
      if (current() && order.success) this.begin(order.data)
    })
    socket.on('run:prompt', (message) => {
      const prompt = RunPrompt.safeParse(message)
      if (!current() || !prompt.success) return
      this.prompt = prompt.data
      if (this.run?.id === prompt.data.run) this.source.prompt(prompt.data)
    })
    socket.on('run:committed', (message) => {
      if (this.run && this.run.id === message.run) this.run.committed(message.committed)
    })
    socket.on('run:ended', (message) => {
      if (this.run?.id !== message.run) return
      this.log(`Run ${message.run} ended: ${message.outcome}, verdict ${message.verdict ?? 'not there'}`)
      this.forget()
    })
    socket.on('bench:refused', (problem) => this.refused(problem, 'A message'))
    socket.on('bench:replaced', (problem) => {
      if (current()) this.giveWay(problem)
    })
    socket.on('bench:simulate', (message, answer) => {
      const result = this.simulate(message)
      if (typeof answer === 'function') answer(result)
    })
  }

  /** The newest connection of a bench wins: this one does not come back. */
  private giveWay(problem: Problem): void {
    this.refused(problem, 'This connection')
    this.stop()
    this.now = 'replaced'
    this.source.serverSeen?.(false)
    this.options.onReplaced?.()
  }

  private simulate(message: unknown): BenchAnswer<object> {
    if (!this.source.simulate) return { ok: false, problem: problemOf('bench.not-simulated') }
    const command = SimulationCommand.safeParse(message)
    if (!command.success) return { ok: false, problem: problemOf('protocol.message') }
    this.source.simulate(command.data)
    return { ok: true }
  }

  private hello(socket: BenchSocket): void {
    const { source, run } = this
    const message: BenchHello = {
      protocolVersion: PROTOCOL_VERSION,
      channelKind: source.channelKind,
      frameMs: source.frameMs,
      mainsHz: source.mainsHz,
      capabilities: [...source.capabilities],
      algorithms: { ...source.algorithms },
      wallClock: this.clock.wallClock().toISOString(),
      holding: run ? { run: run.id, from: run.heldFrom() } : null,
    }
    socket.timeout(this.answerTimeoutMs).emit('bench:hello', message, (late, answer: HelloAnswer) => {
      if (this.connection.current() !== socket) return
      if (!late && answer.ok) return this.welcome(answer)
      if (!late && !answer.ok) this.refused(answer.problem, 'The hello')
      this.connection.openLater(RETRY_MS)
    })
  }

  private welcome(answer: Extract<HelloAnswer, { ok: true }>): void {
    this.connection.settle()
    this.now = 'ready'
    this.refusedInARow = 0
    this.holdSendingUntilMs = 0
    this.verifiedUntil = answer.verifiedUntil
    this.log(`Connected as ${answer.name}`)
    this.source.serverSeen?.(true)
    // Without an order what is held stays: its run may be judged and not stored yet.
    if (answer.order) this.begin(answer.order)
    if (!answer.verified) this.verify()
  }

  private begin(order: RunOrder): void {
    const known = this.run?.id === order.run
    if (this.run && known && this.run.goOnFrom(order.from)) {
      this.run.setWindow(order.window)
    } else {
      if (this.run && !known) this.forgetRun()
      this.log(`Run ${order.run} of ${order.serial} from frame ${order.from}`)
      this.source.start(order)
      this.run = makeFrameRun(this.source, order, this.options.mostHeldFrames)
    }
    if (this.prompt?.run === order.run) this.source.prompt(this.prompt)
    this.flush()
  }

  private forget(): void {
    this.prompt = null
    this.forgetRun()
  }

  private forgetRun(): void {
    this.run = null
    this.source.finish()
  }

  private verify(): void {
    const socket = this.connection.current()
    if (!socket || this.verifying) return
    const measured = this.source.verifySelf?.()
    if (!measured) return
    this.verifying = true
    socket.timeout(this.answerTimeoutMs).emit('bench:verify', measured, (late, answer) => {
      if (this.connection.current() !== socket) return
      this.verifying = false
      if (late) return
      if (!answer.ok) return this.refused(answer.problem, 'The verification')
      this.verifiedUntil = answer.validUntil
      this.log(
        answer.passed
          ? `Verified until ${answer.validUntil ?? 'further notice'}`
          : `Not verified: ${answer.reasons.join('; ')}`,
      )
    })
  }

  private renewVerification(): void {
    if (this.now !== 'ready' || this.run || this.verifiedUntil === null) return
    const leftMs = Date.parse(this.verifiedUntil) - this.clock.wallClock().getTime()
    if (!(leftMs < RENEW_BEFORE_MS)) return
    this.verifiedUntil = null
    this.verify()
  }

  private flush(): void {
    const socket = this.connection.current()
    const { run } = this
    if (!socket || !run || this.inFlight || this.now !== 'ready') return
    if (this.clock.nowMs() < this.holdSendingUntilMs) return
    const batch = run.nextBatch()
    if (!batch) return
    this.inFlight = true
    socket.timeout(this.answerTimeoutMs).emit('bench:frames', batch, (late, answer: FramesAnswer) => {
      if (this.connection.current() !== socket) return
      this.inFlight = false
      if (this.run === run) {
        if (late) this.log('No answer to a batch; it is sent again')
        else if (answer.ok) this.taken(run, answer)
        else this.notTaken(run, answer.problem)
      }
      this.flush()
    })
  }

  private taken(run: FrameRun, answer: { next: number; committed: number; window: number }): void {
    this.refusedInARow = 0
    run.accepted(answer.next, answer.committed, answer.window)
    if (answer.window === 0) this.pause()
    // recordings and fast models do not wait for the clock
    else if (!this.source.realTime || (this.source.timeScale ?? 1) > 1) run.make()
  }

  private notTaken(run: FrameRun, problem: Problem): void {
    this.refused(problem, 'A batch')
    this.refusedInARow += 1
    const { next, window } = problem.facts ?? {}
    switch (problem.code) {
      case 'frames.gap':
        if (typeof next !== 'number' || !run.goOnFrom(next)) this.helloAgain()
        return
      case 'run.not-open':
        // kept until the server says how it ended: it may ask again after its own restart
        run.close()
        return
      case 'run.unknown':
        this.forget()
        return
      case 'frames.foreign':
        run.close()
        this.helloAgain()
        return
      case 'frames.window':
        run.setWindow(typeof window === 'number' ? window : 1)
        return
      case 'storage.away':
        this.pause()
        return
      default:
        this.pause()
        if (problem.code === 'protocol.hello-first' || this.refusedInARow >= MOST_REFUSALS_IN_A_ROW)
          this.helloAgain()
    }
  }

  private helloAgain(): void {
    const socket = this.connection.current()
    this.refusedInARow = 0
    if (socket) this.hello(socket)
  }

  private pause(): void {
    this.holdSendingUntilMs = this.clock.nowMs() + RETRY_MS
  }

  private tick(): void {
    this.cancelTick = this.clock.after(this.options.batchMs ?? 50, () => this.tick())
    const now = this.clock.nowMs()
    this.run?.elapse(now - this.lastTickMs)
    this.lastTickMs = now
    this.flush()
    this.renewVerification()
  }
}

function problemOf(code: ErrorCode): Problem {
  return { type: `urn:problem-type:evenstrung:${code}`, code, ...ERRORS[code], status: 400 }
}

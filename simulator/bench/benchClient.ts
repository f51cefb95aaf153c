import { io } from 'socket.io-client'
import type { Socket } from 'socket.io-client'
import { BENCH_NAMESPACE, PROTOCOL_VERSION, RunOrder, RunPrompt } from '../../src/shared/contract/frames.ts'
import type {
  BenchAnswer,
  BenchHello,
  BenchToServer,
  FramesAnswer,
  HelloAnswer,
  ServerToBench,
} from '../../src/shared/contract/frames.ts'
import { ERRORS } from '../../src/shared/contract/errors.ts'
import type { ErrorCode, Problem } from '../../src/shared/contract/errors.ts'
import { SimulationCommand } from '../../src/shared/contract/simulation.ts'
import type { BenchSource } from '../sources/source.ts'
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
/** A refused token is tried again seldom: only a person can put it right. */
const TOKEN_RETRY_MS = 30_000
/** A verification is renewed when it ends within this time and no run is open, ms. */
const RENEW_BEFORE_MS = 3_600_000
const MOST_REFUSALS_IN_A_ROW = 5

type BenchSocket = Socket<ServerToBench, BenchToServer>

/** Speaks for a source to the server: hello, verification, frames in batches, and all that can go wrong between. */
export function createBenchClient(options: BenchClientOptions): BenchClient {
  const { source } = options
  const clock = options.clock ?? systemClock
  const log = options.log ?? (() => undefined)
  const batchMs = options.batchMs ?? 50
  const answerTimeoutMs = options.answerTimeoutMs ?? 10_000
  const backoff = options.backoffMs ?? { first: 250, most: 10_000 }
  const jitter = options.jitter ?? Math.random
  const refusals = new Map<string, number>()
  let socket: BenchSocket | null = null
  let state: BenchClientState = 'stopped'
  let attempts = 0
  let run: FrameRun | null = null
  let prompt: RunPrompt | null = null
  let inFlight = false
  let holdSendingUntilMs = 0
  let refusedInARow = 0
  let verifiedUntil: string | null = null
  let verifying = false
  let lastTickMs = 0
  let cancelTick: () => void = () => undefined
  let cancelConnect: () => void = () => undefined

  function refused(problem: Problem, of: string): void {
    refusals.set(problem.code, (refusals.get(problem.code) ?? 0) + 1)
    log(`${of} was refused (${problem.code}): ${problem.title} ${problem.remedy}`)
  }

  function connect(): void {
    state = 'connecting'
    const opened: BenchSocket = io(options.url + BENCH_NAMESPACE, {
      transports: ['websocket'],
      auth: { token: options.token },
      reconnection: false,
      forceNew: true,
    })
    socket = opened
    const current = (): boolean => socket === opened
    opened.on('connect', () => {
      if (current()) hello(opened)
    })
    opened.on('connect_error', (error: Error & { data?: Problem }) => {
      if (!current()) return
      if (error.data?.code) refused(error.data, 'The connection')
      else log(`No connection: ${error.message}`)
      reconnect(error.data?.code === 'bench.token' ? TOKEN_RETRY_MS : 0)
    })
    opened.on('disconnect', (reason) => {
      if (!current()) return
      log(`The connection ended: ${reason}`)
      reconnect(0)
    })
    listen(opened, current)
  }

  function reconnect(leastMs: number): void {
    dropSocket()
    source.serverSeen?.(false)
    state = 'waiting'
    const waitMs =
      Math.min(backoff.most, backoff.first * 2 ** Math.min(attempts, 16)) * (0.5 + 0.5 * jitter())
    attempts += 1
    cancelConnect()
    cancelConnect = clock.after(Math.max(waitMs, leastMs), connect)
  }

  function dropSocket(): void {
    const old = socket
    socket = null
    inFlight = false
    verifying = false
    old?.removeAllListeners()
    old?.disconnect()
  }

  function listen(opened: BenchSocket, current: () => boolean): void {
    opened.on('run:start', (message) => {
      const order = RunOrder.safeParse(message)
      if (current() && order.success) begin(order.data)
    })
    opened.on('run:prompt', (message) => {
      const parsed = RunPrompt.safeParse(message)
      if (!current() || !parsed.success) return
      prompt = parsed.data
      if (run?.id === prompt.run) source.prompt(prompt)
    })
    opened.on('run:committed', (message) => {
      if (run && run.id === message.run) run.committed(message.committed)
    })
    opened.on('run:ended', (message) => {
      if (run?.id !== message.run) return
      log(`Run ${message.run} ended: ${message.outcome}, verdict ${message.verdict ?? 'none yet'}`)
      forget()
    })
    opened.on('bench:refused', (problem) => {
      refused(problem, 'A message')
    })
    opened.on('bench:replaced', (problem) => {
      if (!current()) return
      refused(problem, 'This connection')
      cancelTick()
      dropSocket()
      state = 'replaced'
      source.serverSeen?.(false)
      options.onReplaced?.()
    })
    opened.on('bench:simulate', (message, answer) => {
      const result = simulate(message)
      if (typeof answer === 'function') answer(result)
    })
  }

  function simulate(message: unknown): BenchAnswer<object> {
    if (!source.simulate) return { ok: false, problem: problemOf('bench.not-simulated') }
    const command = SimulationCommand.safeParse(message)
    if (!command.success) return { ok: false, problem: problemOf('protocol.message') }
    source.simulate(command.data)
    return { ok: true }
  }

  function hello(opened: BenchSocket): void {
    const message: BenchHello = {
      protocolVersion: PROTOCOL_VERSION,
      channelKind: source.channelKind,
      frameMs: source.frameMs,
      mainsHz: source.mainsHz,
      capabilities: [...source.capabilities],
      algorithms: { ...source.algorithms },
      wallClock: clock.wallClock().toISOString(),
      holding: run ? { run: run.id, from: run.heldFrom() } : null,
    }
    opened.timeout(answerTimeoutMs).emit('bench:hello', message, (late, answer: HelloAnswer) => {
      if (socket !== opened) return
      if (late || !answer.ok) {
        if (!late && !answer.ok) refused(answer.problem, 'The hello')
        reconnect(RETRY_MS)
        return
      }
      attempts = 0
      state = 'ready'
      refusedInARow = 0
      holdSendingUntilMs = 0
      verifiedUntil = answer.verifiedUntil
      log(`Connected as ${answer.name}`)
      source.serverSeen?.(true)
      if (answer.order) begin(answer.order)
      else if (run) forget()
      if (!answer.verified) verify()
    })
  }

  function begin(order: RunOrder): void {
    const known = run?.id === order.run
    if (run && known && run.goOnFrom(order.from)) {
      run.setWindow(order.window)
    } else {
      if (run && !known) forget()
      log(`Run ${order.run} of ${order.serial} from frame ${order.from}`)
      source.start(order)
      run = makeFrameRun(source, order, { mostHeld: options.mostHeldFrames, fresh: true })
    }
    if (prompt?.run === order.run) source.prompt(prompt)
    flush()
  }

  function forget(): void {
    run = null
    prompt = null
    source.finish()
  }

  function verify(): void {
    const opened = socket
    const measured = source.verifySelf?.()
    if (!opened || !measured || verifying) return
    verifying = true
    opened.timeout(answerTimeoutMs).emit('bench:verify', measured, (late, answer) => {
      if (socket !== opened) return
      verifying = false
      if (late) return
      if (!answer.ok) {
        refused(answer.problem, 'The verification')
        return
      }
      verifiedUntil = answer.validUntil
      log(
        answer.passed
          ? `Verified until ${answer.validUntil ?? '?'}`
          : `Not verified: ${answer.reasons.join('; ')}`,
      )
    })
  }

  function renewVerification(): void {
    if (state !== 'ready' || run || verifiedUntil === null) return
    const leftMs = Date.parse(verifiedUntil) - clock.wallClock().getTime()
    if (leftMs < RENEW_BEFORE_MS) {
      verifiedUntil = null
      verify()
    }
  }

  function flush(): void {
    const opened = socket
    if (!opened || !run || inFlight || state !== 'ready' || clock.nowMs() < holdSendingUntilMs) return
    const batch = run.nextBatch()
    if (!batch) return
    const sentRun = run
    inFlight = true
    opened.timeout(answerTimeoutMs).emit('bench:frames', batch, (late, answer: FramesAnswer) => {
      if (socket !== opened) return
      inFlight = false
      if (run !== sentRun) {
        flush()
        return
      }
      if (late) log('No answer to a batch; it is sent again')
      else if (answer.ok) taken(sentRun, answer)
      else notTaken(sentRun, answer.problem)
      flush()
    })
  }

  function taken(of: FrameRun, answer: { next: number; committed: number; window: number }): void {
    refusedInARow = 0
    of.accepted(answer.next, answer.committed, answer.window)
    if (answer.window === 0) pause()
    // recordings and fast models do not wait for the clock
    else if (!source.realTime || (source.timeScale ?? 1) > 1) of.make()
  }

  function notTaken(of: FrameRun, problem: Problem): void {
    refused(problem, 'A batch')
    refusedInARow += 1
    const wanted = problem.facts?.next
    switch (problem.code) {
      case 'frames.gap':
        if (typeof wanted !== 'number' || !of.goOnFrom(wanted)) helloAgain()
        return
      case 'run.not-open':
      case 'run.unknown':
        // kept until the server says how it ended: it may ask again after its own restart
        of.close()
        return
      case 'frames.foreign':
        of.close()
        helloAgain()
        return
      case 'storage.away':
        pause()
        return
      case 'frames.window':
        of.setWindow(typeof problem.facts?.window === 'number' ? problem.facts.window : 1)
        return
      default:
        pause()
        if (problem.code === 'protocol.hello-first' || refusedInARow >= MOST_REFUSALS_IN_A_ROW) helloAgain()
    }
  }

  function helloAgain(): void {
    refusedInARow = 0
    if (socket) hello(socket)
  }

  function pause(): void {
    holdSendingUntilMs = clock.nowMs() + RETRY_MS
  }

  function tick(): void {
    cancelTick = clock.after(batchMs, tick)
    const now = clock.nowMs()
    run?.elapse(now - lastTickMs)
    lastTickMs = now
    flush()
    renewVerification()
  }

  return {
    start() {
      if (state !== 'stopped') return
      lastTickMs = clock.nowMs()
      connect()
      tick()
    },
    stop() {
      cancelTick()
      cancelConnect()
      dropSocket()
      state = 'stopped'
    },
    state: () => state,
    refusals: () => refusals,
    runId: () => run?.id ?? null,
  }
}

function problemOf(code: ErrorCode): Problem {
  return { type: `urn:evenstrung:${code}`, code, ...ERRORS[code], status: 400 }
}

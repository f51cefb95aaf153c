import { createServer } from 'node:http'
import type { AddressInfo } from 'node:net'
import { randomUUID } from 'node:crypto'
import { Server } from 'socket.io'
import type { Socket } from 'socket.io'
import {
  BENCH_NAMESPACE,
  BenchHello,
  BenchVerify,
  FrameBatch,
  MAX_BATCH_FRAMES,
  PROTOCOL_VERSION,
} from '../../src/shared/contract/frames.ts'
import type {
  BenchToServer,
  FramesAnswer,
  RunOrder,
  ServerToBench,
} from '../../src/shared/contract/frames.ts'
import { ERRORS } from '../../src/shared/contract/errors.ts'
import type { ErrorCode, Problem } from '../../src/shared/contract/errors.ts'

type BenchSocket = Socket<BenchToServer, ServerToBench>

export interface ConformanceCheck {
  name: string
  passed: boolean
  detail: string
}

export interface ConformanceReport {
  passed: boolean
  checks: ConformanceCheck[]
}

export interface ConformanceOptions {
  /** the token that the bench under test uses */
  token: string
  /** longest wait for the bench to do something, ms */
  patienceMs: number
  /** for how long a bench that was replaced has to stay away, ms */
  stayAwayMs: number
  port?: number
}

/**
 * Plays a server that tries a bench: any implementation of bench protocol 1 can be pointed at its address. Give
 * `onListening` the chance to start the bench; the promise ends with a report of every rule that was checked.
 */
export async function runConformance(
  options: ConformanceOptions,
  onListening: (url: string) => void | Promise<void>,
): Promise<ConformanceReport> {
  const http = createServer()
  const io = new Server(http, { serveClient: false })
  const play = new Play(options)
  io.of(BENCH_NAMESPACE).on('connection', (socket: BenchSocket) => play.connected(socket))
  await new Promise<void>((resolve) => http.listen(options.port ?? 0, '127.0.0.1', resolve))
  try {
    await onListening(`http://127.0.0.1:${(http.address() as AddressInfo).port}`)
    await play.run()
  } finally {
    await io.close()
  }
  return { passed: play.checks.every((check) => check.passed), checks: play.checks }
}

interface Message<T> {
  body: T
  answer: (a: unknown) => void
}

/** Messages of one kind, waited for one after the other. */
class Inbox<T> {
  private readonly waiting: Message<T>[] = []
  private wanted: ((message: Message<T>) => void) | null = null

  put(message: Message<T>): void {
    if (this.wanted) {
      const { wanted } = this
      this.wanted = null
      wanted(message)
    } else this.waiting.push(message)
  }

  get size(): number {
    return this.waiting.length
  }

  clear(): void {
    this.waiting.length = 0
  }

  take(patienceMs: number, what: string): Promise<Message<T>> {
    const there = this.waiting.shift()
    if (there) return Promise.resolve(there)
    return new Promise((resolve, reject) => {
      const timer = setTimeout(() => {
        this.wanted = null
        reject(new Error(`waited ${patienceMs} ms for ${what}`))
      }, patienceMs)
      this.wanted = (message) => {
        clearTimeout(timer)
        resolve(message)
      }
    })
  }
}

class Play {
  readonly checks: ConformanceCheck[] = []
  private readonly options: ConformanceOptions
  private readonly sockets = new Inbox<BenchSocket>()
  private readonly hellos = new Inbox<unknown>()
  private readonly verifies = new Inbox<unknown>()
  private readonly batches = new Inbox<unknown>()
  private socket: BenchSocket | null = null
  private channels = 1
  private readonly seen = new Map<number, string>()
  private readonly run_: string = randomUUID()

  constructor(options: ConformanceOptions) {
    this.options = options
  }

  connected(socket: BenchSocket): void {
    socket.on('bench:hello', (body, answer) =>
      this.hellos.put({ body, answer: answer as (a: unknown) => void }),
    )
    socket.on('bench:verify', (body, answer) =>
      this.verifies.put({ body, answer: answer as (a: unknown) => void }),
    )
    socket.on('bench:frames', (body, answer) =>
      this.batches.put({ body, answer: answer as (a: unknown) => void }),
    )
    this.sockets.put({ body: socket, answer: () => undefined })
  }

  async run(): Promise<void> {
    try {
      await this.greeting()
      await this.firstBatches()
      await this.gap()
      await this.storageAway()
      await this.smallerWindow()
      await this.reconnection()
      await this.ending()
      await this.replaced()
    } catch (error) {
      this.check(
        'the bench kept going to the end',
        false,
        error instanceof Error ? error.message : String(error),
      )
    }
  }

  private check(name: string, passed: boolean, detail = ''): void {
    this.checks.push({ name, passed, detail: passed ? '' : detail })
  }

  private async nextSocket(): Promise<BenchSocket> {
    const { body } = await this.sockets.take(this.options.patienceMs, 'a connection')
    this.socket = body
    return body
  }

  private order(from: number, window: number): RunOrder {
    return {
      run: this.run_,
      serial: 'CONFORM001',
      from,
      window,
      noiseStretchMs: 2000,
      expectedHz: [[329.63], [246.94], [196], [146.83], [110], [82.41]],
    }
  }

  private async greet(order: RunOrder | null, verified: boolean): Promise<BenchHello> {
    const hello = await this.hellos.take(this.options.patienceMs, 'bench:hello')
    const parsed = BenchHello.safeParse(hello.body)
    this.check('hello has the agreed shape', parsed.success, parsed.error?.message)
    if (!parsed.success) throw new Error('without a proper hello nothing else can be tried')
    hello.answer({
      ok: true,
      benchId: randomUUID(),
      name: 'Conformance',
      verified,
      verifiedUntil: null,
      order,
    })
    return parsed.data
  }

  private async greeting(): Promise<void> {
    const socket = await this.nextSocket()
    const { handshake } = socket
    this.check(
      'websocket is the transport',
      socket.conn.transport.name === 'websocket',
      socket.conn.transport.name,
    )
    this.check(
      'the token is in the handshake',
      (handshake.auth as { token?: string }).token === this.options.token,
    )
    this.check('the token is not in the address', !handshake.url.includes(this.options.token), handshake.url)
    const hello = await this.greet(null, false)
    this.check(
      'the protocol version is 1',
      hello.protocolVersion === PROTOCOL_VERSION,
      String(hello.protocolVersion),
    )
    this.channels = hello.channelKind === 'six' ? 6 : 1
    this.check('nothing is held before the first run', hello.holding === null)
    const verify = await this.verifies.take(
      this.options.patienceMs,
      'bench:verify of a bench that is not verified',
    )
    const parsed = BenchVerify.safeParse(verify.body)
    this.check('the verification has the agreed shape', parsed.success, parsed.error?.message)
    verify.answer({
      ok: true,
      passed: true,
      validUntil: new Date(Date.now() + 3_600_000).toISOString(),
      reasons: [],
    })
    this.check('no frames are sent outside a run', this.batches.size === 0)
    socket.emit('run:start', this.order(0, MAX_BATCH_FRAMES))
  }

  /** Takes the next batch, checks its shape and its place, and remembers its frames; the answer is the caller's. */
  private async batch(window: number): Promise<{ batch: FrameBatch; answer: (a: FramesAnswer) => void }> {
    const message = await this.batches.take(this.options.patienceMs, 'bench:frames')
    const parsed = FrameBatch.safeParse(message.body)
    if (!parsed.success) {
      this.check('a batch has the agreed shape', false, parsed.error.message)
      throw new Error('the frames cannot be read')
    }
    const batch = parsed.data
    const end = batch.from + batch.frames.length
    this.demand('a batch names its run', batch.run === this.run_, batch.run)
    this.demand(
      'a batch keeps to the window',
      batch.frames.length <= window,
      `${batch.frames.length} of ${window}`,
    )
    this.demand(
      'a frame has a value for each channel',
      batch.frames.every((f) => f.levelMdb.length === this.channels && f.levelAMdb.length === this.channels),
    )
    this.demand(
      'an event lies within its batch',
      batch.events.every((event) => event.frame >= batch.from && event.frame < end),
    )
    batch.frames.forEach((frame, i) => {
      const text = JSON.stringify(frame)
      const before = this.seen.get(batch.from + i)
      if (before !== undefined)
        this.demand('a frame that is sent again is the same', before === text, `frame ${batch.from + i}`)
      this.seen.set(batch.from + i, text)
    })
    return { batch, answer: message.answer }
  }

  /** Notes a rule only when it is broken for the first time; `summary` notes the kept ones. */
  private demand(name: string, passed: boolean, detail = ''): void {
    const known = this.checks.find((check) => check.name === name)
    if (!known) this.check(name, passed, detail)
    else if (!passed && known.passed) Object.assign(known, { passed, detail })
  }

  private async firstBatches(): Promise<void> {
    let next = 0
    for (let round = 0; round < 4; round++) {
      const { batch, answer } = await this.batch(MAX_BATCH_FRAMES)
      this.demand(
        'frames follow one another from the number that was wanted',
        batch.from === next,
        `${batch.from}`,
      )
      next = batch.from + batch.frames.length
      await pause(60)
      this.demand(
        'one batch is in flight',
        this.batches.size === 0,
        `${this.batches.size} more before the answer`,
      )
      answer({ ok: true, next, committed: 0, window: MAX_BATCH_FRAMES })
    }
  }

  private async gap(): Promise<void> {
    const { answer } = await this.batch(MAX_BATCH_FRAMES)
    answer({ ok: false, problem: problem('frames.gap', { next: 1 }) })
    const { batch, answer: next } = await this.batch(MAX_BATCH_FRAMES)
    this.check(
      'after a gap the frames come from the number that was named',
      batch.from === 1,
      `from ${batch.from}`,
    )
    next({ ok: true, next: batch.from + batch.frames.length, committed: 0, window: MAX_BATCH_FRAMES })
  }

  private async storageAway(): Promise<void> {
    const { batch, answer } = await this.batch(MAX_BATCH_FRAMES)
    answer({ ok: false, problem: problem('storage.away', { next: batch.from, committed: 0 }) })
    const { batch: again, answer: next } = await this.batch(MAX_BATCH_FRAMES)
    this.check('frames that could not be taken come again', again.from === batch.from, `from ${again.from}`)
    next({ ok: true, next: again.from + again.frames.length, committed: 0, window: 7 })
  }

  private async smallerWindow(): Promise<void> {
    const { batch, answer } = await this.batch(7)
    answer({ ok: true, next: batch.from + batch.frames.length, committed: 0, window: MAX_BATCH_FRAMES })
  }

  private async reconnection(): Promise<void> {
    await this.batch(MAX_BATCH_FRAMES)
    const committed = 2
    this.socket!.emit('run:committed', { run: this.run_, committed })
    this.socket!.conn.close()
    this.batches.clear()
    await this.nextSocket()
    const hello = await this.greet(this.order(committed, MAX_BATCH_FRAMES), true)
    this.check('after a break the hello names the run that it holds', hello.holding?.run === this.run_)
    this.check(
      'frames are kept until they are committed',
      hello.holding !== null && hello.holding.from <= committed,
      `from ${hello.holding?.from}`,
    )
    const { batch, answer } = await this.batch(MAX_BATCH_FRAMES)
    this.check(
      'after a break the frames come from the number that was ordered',
      batch.from === committed,
      `${batch.from}`,
    )
    answer({ ok: true, next: batch.from + batch.frames.length, committed, window: MAX_BATCH_FRAMES })
  }

  private async ending(): Promise<void> {
    const { batch, answer } = await this.batch(MAX_BATCH_FRAMES)
    const next = batch.from + batch.frames.length
    answer({ ok: true, next, committed: next, window: MAX_BATCH_FRAMES })
    this.socket!.emit('run:ended', { run: this.run_, outcome: 'sealed', verdict: 'pass' })
    const late = await this.batches.take(300, 'nothing').catch(() => null)
    late?.answer({ ok: false, problem: problem('run.not-open', {}) })
    await pause(300)
    this.check(
      'after the end no more frames are sent',
      this.batches.size === 0,
      `${this.batches.size} batches`,
    )
  }

  private async replaced(): Promise<void> {
    this.socket!.emit('bench:replaced', problem('bench.replaced', {}))
    this.socket!.disconnect(true)
    const back = await this.sockets.take(this.options.stayAwayMs, 'nothing').then(
      () => true,
      () => false,
    )
    this.check('a bench that was replaced stays away', !back, 'it connected again')
  }
}

function problem(code: ErrorCode, facts: Problem['facts']): Problem {
  return { type: `urn:problem-type:evenstrung:${code}`, code, ...ERRORS[code], status: 409, facts }
}

/** The rules about what must not come need a stretch of time in which it could come. */
function pause(ms: number): Promise<void> {
  return new Promise((resolve) => setTimeout(resolve, ms))
}

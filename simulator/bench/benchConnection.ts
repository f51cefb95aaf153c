import { io } from 'socket.io-client'
import type { Socket } from 'socket.io-client'
import type { Problem } from '../../src/shared/contract/errors.ts'
import { BENCH_NAMESPACE } from '../../src/shared/contract/frames.ts'
import type { BenchToServer, ServerToBench } from '../../src/shared/contract/frames.ts'
import type { Clock } from './clock.ts'

export type BenchSocket = Socket<ServerToBench, BenchToServer>

export interface BenchConnectionOptions {
  /** address of the server, without the namespace */
  url: string
  token: string
  clock: Clock
  backoffMs: { first: number; most: number }
  /** 0..1, spreads the waiting of many benches */
  jitter: () => number
  log: (line: string) => void
  refused: (problem: Problem, of: string) => void
  /** a new socket: listen to it before it connects; `current` says whether it is still the one in use */
  opened: (socket: BenchSocket, current: () => boolean) => void
  connected: (socket: BenchSocket) => void
  lost: () => void
}

/** A refused token is tried again seldom: only a person can put it right. */
const TOKEN_RETRY_MS = 30_000

/** One websocket to the server at a time; opens the next one by itself, later after each failure. */
export class BenchConnection {
  private readonly options: BenchConnectionOptions
  private socket: BenchSocket | null = null
  private attempts = 0
  private cancelWait: () => void = () => undefined

  constructor(options: BenchConnectionOptions) {
    this.options = options
  }

  current(): BenchSocket | null {
    return this.socket
  }

  open(): void {
    const { url, token, refused, log } = this.options
    const socket: BenchSocket = io(url + BENCH_NAMESPACE, {
      transports: ['websocket'],
      auth: { token },
      reconnection: false,
      forceNew: true,
    })
    this.socket = socket
    const current = (): boolean => this.socket === socket
    this.options.opened(socket, current)
    socket.on('connect', () => {
      if (current()) this.options.connected(socket)
    })
    socket.on('connect_error', (error: Error & { data?: Problem }) => {
      if (!current()) return
      if (error.data?.code) refused(error.data, 'The connection')
      else log(`No connection: ${error.message}`)
      this.openLater(error.data?.code === 'bench.token' ? TOKEN_RETRY_MS : 0)
    })
    socket.on('disconnect', (reason) => {
      if (!current()) return
      log(`The connection ended: ${reason}`)
      this.openLater(0)
    })
  }

  /** The server has answered: the next failure counts as the first. */
  settle(): void {
    this.attempts = 0
  }

  openLater(leastMs: number): void {
    const { first, most } = this.options.backoffMs
    this.close()
    this.options.lost()
    const waitMs =
      Math.min(most, first * 2 ** Math.min(this.attempts, 16)) * (0.5 + 0.5 * this.options.jitter())
    this.attempts += 1
    this.cancelWait = this.options.clock.after(Math.max(waitMs, leastMs), () => {
      this.options.log('Connecting again')
      this.open()
    })
  }

  close(): void {
    this.cancelWait()
    const old = this.socket
    this.socket = null
    old?.removeAllListeners()
    old?.disconnect()
  }
}

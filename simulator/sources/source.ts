import type {
  BenchEvent,
  BenchVerify,
  ChannelKind,
  Frame,
  FrameMs,
  RunOrder,
  RunPrompt,
} from '../../src/shared/contract/frames.ts'
import type { Capability } from '../../src/shared/contract/rules.ts'
import type { SimulationCommand } from '../../src/shared/contract/simulation.ts'

/** One frame with the events that are sent with it: each event's `frame` is the number that was asked for. */
export interface SourceStep {
  frame: Frame
  events: BenchEvent[]
}

/**
 * Where a bench's frames come from: a modelled instrument, a recording, or raw samples from a pipe. The client
 * asks for frames in order, one number after the other, and only inside a run.
 */
export interface BenchSource {
  readonly channelKind: ChannelKind
  readonly frameMs: FrameMs
  readonly mainsHz: 50 | 60
  readonly capabilities: readonly Capability[]
  /** names and versions of what turns samples into frames; kept with every run (at most 40 characters each) */
  readonly algorithms: Readonly<Record<string, string>>
  /** true: one frame for every frame length of time; false: as fast as the server takes them */
  readonly realTime: boolean
  /**
   * true: a frame number always gives the same frame, as in a recording, so a restarted bench goes on without a
   * break; false: what was not sent before a restart is gone and the client reports a discontinuity.
   */
  readonly repeatable: boolean
  /** A real-time source may run so many times faster than a clock; left out: 1. */
  readonly timeScale?: number
  /** A run begins, or goes on after a restart at order.from. Frame numbers count from the run's start. */
  start(order: RunOrder): void
  /** The server's prompt changed; an instrument with an automatic hand follows it, a recording ignores it. */
  prompt(prompt: RunPrompt): void
  /**
   * 'notYet': nothing to give at this moment, ask again; 'ended': nothing will come any more. A source that ends
   * puts an `endOfSource` event into its last step.
   */
  next(frameNo: number): SourceStep | 'notYet' | 'ended'
  /** Whether the server answers at present: a person at the bench would stop and wait. */
  serverSeen?(seen: boolean): void
  /** The run is over, sealed or not. */
  finish(): void
  /** Measure the check standard; left out where there is nothing to measure it with. */
  verifySelf?(): BenchVerify
  /** Simulated instruments only. */
  simulate?(command: SimulationCommand): void
  /** Give back files, pipes and workers. */
  close?(): Promise<void>
}

import { SILENCE_MDB, NOT_MEASURED_MDB } from '../../src/shared/contract/quantities.ts'
import type { Frame } from '../../src/shared/contract/frames.ts'
import type { LiveLevels } from '../../src/shared/contract/live.ts'
import type { MeasuredRun } from '../../src/shared/contract/measured.ts'
import type { RunAction, RunView } from '../../src/shared/contract/runs.ts'
import { methods } from '../../src/shared/measure/method.ts'
import type { MethodCode } from '../../src/shared/measure/method.ts'
import type { RunState } from '../../src/shared/measure/runState.ts'
import type { RunRow } from './runs.queries.ts'
import { SerialQueue } from './serialQueue.ts'
import { TraceBuffer } from './traceBuffer.ts'

/** A run that is being measured: what the row in the database does not hold yet. */
export interface OpenRun {
  row: RunRow
  method: MethodCode
  state: RunState
  /** number of the next frame wanted */
  next: number
  buffer: TraceBuffer
  /** frames below this number are in the database */
  committed: number
  segmentNo: number
  committing: boolean
  /** this server closes before a segment was stored: nothing after it is stored either */
  halted: boolean
  actions: RunAction[]
  /** stored before a restart, beyond the frames that were committed: they apply when their frame comes again */
  waiting: RunAction[]
  /** an action's insert had no known outcome: stored ones that are not in `actions` are to be removed */
  actionsUncertain: boolean
  ending: { status: 'sealed' | 'stopped' | 'interrupted'; reason: string | null } | null
  storage: RunView['storage']
  /** frames and actions of one run pass one after the other */
  queue: SerialQueue
  /** commits of its trace, then its end, one after the other */
  storing: SerialQueue
  lastHeardMs: number
  /** the view that was worked out last */
  measured: MeasuredRun
  /** change count that it shows */
  measuredAt: number
  /** measuring threw: frames are kept all the same, the run ends without a verdict */
  fault: Error | null
  levels: Levels
}

interface Levels {
  frame: number
  levelMdb: number[]
  jackMdb: number
  last: Frame | null
}

export function channelsOf(row: RunRow): number {
  return row.setup.channelKind === 'six' ? 6 : 1
}

export function openRunOf(row: RunRow, nowMs: number): OpenRun {
  const method = methods[row.setup.method]
  if (!method) throw new Error(`method ${row.setup.method} is not part of this program`)
  const channels = channelsOf(row)
  const state = method.startRun(row.setup)
  return {
    row,
    method,
    state,
    measured: method.viewRun(state),
    measuredAt: method.changeCount(state),
    fault: null,
    next: 0,
    buffer: new TraceBuffer(channels),
    committed: 0,
    segmentNo: 0,
    committing: false,
    halted: false,
    actions: [],
    waiting: [],
    actionsUncertain: false,
    ending: null,
    storage: 'live',
    queue: new SerialQueue(),
    storing: new SerialQueue(),
    lastHeardMs: nowMs,
    levels: { frame: -1, levelMdb: emptyLevels(channels), jackMdb: NOT_MEASURED_MDB, last: null },
  }
}

/**
 * Everything measured so far; should working it out fail, the view before it, and the run is marked as faulty;
 * once the run has ended, what was judged then.
 */
export function measuredOf(run: OpenRun): MeasuredRun {
  const isSame = run.measured.frames === run.next && run.measuredAt === run.method.changeCount(run.state)
  if (run.fault || run.ending || isSame) return run.measured
  try {
    run.measuredAt = run.method.changeCount(run.state)
    run.measured = run.method.viewRun(run.state)
  } catch (error) {
    run.fault = error instanceof Error ? error : new Error(String(error))
  }
  return run.measured
}

/** Keeps the loudest frame of each channel until the next live update takes it. */
export function noteLevels(run: OpenRun, frame: Frame, frameNo: number): void {
  const { levels } = run
  for (let i = 0; i < frame.levelMdb.length; i++)
    levels.levelMdb[i] = louder(levels.levelMdb[i]!, frame.levelMdb[i]!)
  levels.jackMdb = louder(levels.jackMdb, frame.jackMdb)
  levels.frame = frameNo
  levels.last = frame
}

/** The thinned levels since the last call; null when there was no frame. */
export function takeLevels(run: OpenRun): LiveLevels | null {
  const { levels } = run
  if (!levels.last) return null
  const live: LiveLevels = {
    run: run.row.id,
    frame: levels.frame,
    levelMdb: levels.levelMdb,
    jackMdb: levels.jackMdb,
    plugged: levels.last.plugged,
    ringSleeveClosed: levels.last.ringSleeveClosed,
    tipClosed: levels.last.tipClosed,
  }
  run.levels = {
    frame: levels.frame,
    levelMdb: emptyLevels(levels.levelMdb.length),
    jackMdb: NOT_MEASURED_MDB,
    last: null,
  }
  return live
}

function emptyLevels(channels: number): number[] {
  return new Array<number>(channels).fill(NOT_MEASURED_MDB)
}

function louder(a: number, b: number): number {
  if (a === NOT_MEASURED_MDB) return b
  if (b === NOT_MEASURED_MDB) return a
  if (a === SILENCE_MDB) return b
  return Math.max(a, b)
}

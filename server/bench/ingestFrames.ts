import type { BenchEvent, Frame, FrameBatch } from '../../src/shared/contract/frames.ts'
import { applyStored, eventsByFrame } from '../../src/shared/measure/replayStored.ts'
import { AppError } from '../errors.ts'
import { channelsOf, noteLevels } from '../runs/openRun.ts'
import type { OpenRun } from '../runs/openRun.ts'

const NO_EVENTS: readonly BenchEvent[] = []

/**
 * Frames that the server holds and could not commit yet; beyond it new ones are refused and stay with the bench,
 * so that a database that is away for long costs bounded memory. Ten minutes at 10 ms.
 */
export const MOST_UNCOMMITTED_FRAMES = 60_000

/**
 * Takes a batch into an open run: repeats fall away, a gap is refused with the frame wanted. Every door for frames
 * leads here. Returns how many frames were new.
 */
export function ingestFrames(run: OpenRun, batch: FrameBatch): number {
  if (batch.run !== run.row.id) throw new AppError('frames.foreign', { facts: { run: run.row.id } })
  if (batch.from > run.next) throw new AppError('frames.gap', { facts: { next: run.next } })
  if (run.buffer.frames + batch.frames.length > MOST_UNCOMMITTED_FRAMES)
    throw new AppError('storage.away', { facts: { next: run.next, committed: run.committed } })
  checkShape(run, batch)

  const events = eventsByFrame(batch.events)
  const end = batch.from + batch.frames.length
  let taken = 0
  for (let frameNo = run.next; frameNo < end; frameNo++) {
    applyWaiting(run)
    if (run.method.isFinished(run.state)) break
    const frame = batch.frames[frameNo - batch.from]!
    const with_ = events.get(frameNo) ?? NO_EVENTS
    measure(run, frame, with_)
    run.buffer.append(frame, with_)
    noteLevels(run, frame, frameNo)
    run.next = frameNo + 1
    taken++
    if (run.method.isFinished(run.state)) break
  }
  applyWaiting(run)
  return taken
}

/** The trace comes first: a fault in measuring loses no frame, so that the run can be computed again. */
function measure(run: OpenRun, frame: Frame, events: readonly BenchEvent[]): void {
  if (run.fault) return
  try {
    run.method.takeFrame(run.state, frame, events)
  } catch (error) {
    run.fault = error instanceof Error ? error : new Error(String(error))
  }
}

function checkShape(run: OpenRun, batch: FrameBatch): void {
  const channels = channelsOf(run.row)
  for (const frame of batch.frames)
    if (frame.levelMdb.length !== channels || frame.levelAMdb.length !== channels)
      throw new AppError('frames.channels', { facts: { channels } })
  const end = batch.from + batch.frames.length
  for (const event of batch.events)
    if (event.frame < batch.from || event.frame >= end)
      throw new AppError('frames.event-place', { facts: { frame: event.frame, from: batch.from, end } })
}

/** Actions that were stored before a restart take the place that they had. */
function applyWaiting(run: OpenRun): void {
  while (run.waiting[0] && run.waiting[0].frame <= run.next)
    applyStored(run.method, run.state, run.waiting.shift()!)
}

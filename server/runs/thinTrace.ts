import { NOT_MEASURED_MDB } from '../../src/shared/contract/quantities.ts'
import type { Frame } from '../../src/shared/contract/frames.ts'

/** A trace for drawing: the loudest of each group of frames, so that no pluck is lost between two points. */
export function thinTrace(
  frames: readonly Frame[],
  points: number,
): { frames: number; framesPerPoint: number; levelMdb: number[][]; jackMdb: number[] } {
  const framesPerPoint = Math.max(1, Math.ceil(frames.length / points))
  const channels = frames[0]?.levelMdb.length ?? 0
  const levelMdb: number[][] = Array.from({ length: channels }, () => [])
  const jackMdb: number[] = []
  for (let from = 0; from < frames.length; from += framesPerPoint) {
    const group = frames.slice(from, from + framesPerPoint)
    for (let i = 0; i < channels; i++) levelMdb[i]!.push(loudest(group.map((frame) => frame.levelMdb[i]!)))
    jackMdb.push(loudest(group.map((frame) => frame.jackMdb)))
  }
  return { frames: frames.length, framesPerPoint, levelMdb, jackMdb }
}

function loudest(values: readonly number[]): number {
  const measured = values.filter((mdb) => mdb !== NOT_MEASURED_MDB)
  return measured.length ? Math.max(...measured) : NOT_MEASURED_MDB
}

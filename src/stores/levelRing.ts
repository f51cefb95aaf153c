import type { LiveLevels } from '../shared/contract/live.ts'
import { NOT_MEASURED_MDB, SILENCE_MDB } from '../shared/contract/quantities.ts'

/** What is drawn for silence, dBV: below everything that a bench can read. */
export const SILENCE_DRAWN_DB = -140

/** One column of seconds, then one of dBV for each channel; null: not measured. */
export type LevelColumns = (number | null)[][]

export interface LevelRing {
  push: (levels: LiveLevels, frameMs: number) => void
  clear: () => void
  /** the same arrays every time, changed in place */
  columns: () => LevelColumns
}

/** Keeps the last seconds of live levels and never more than `most` updates of them. */
export function createLevelRing(seconds: number, most = 600): LevelRing {
  let columns: LevelColumns = [[]]

  function clear(): void {
    columns = [[]]
  }

  function push(levels: LiveLevels, frameMs: number): void {
    const at = (levels.frame * frameMs) / 1000
    const times = columns[0]!
    const last = times.at(-1)
    // After a restart of the server frames are sent again: what was drawn of them is drawn anew.
    if (columns.length !== levels.levelMdb.length + 1 || (last !== undefined && last !== null && at < last)) {
      columns = [[], ...levels.levelMdb.map(() => [])]
    }
    if (columns[0]!.at(-1) === at) return
    columns[0]!.push(at)
    levels.levelMdb.forEach((mdb, i) => columns[i + 1]!.push(drawnDb(mdb)))
    while (columns[0]!.length > most || columns[0]![0]! < at - seconds) {
      for (const column of columns) column.shift()
    }
  }

  return { push, clear, columns: () => columns }
}

function drawnDb(mdb: number): number | null {
  if (mdb === NOT_MEASURED_MDB) return null
  return mdb === SILENCE_MDB ? SILENCE_DRAWN_DB : mdb / 1000
}

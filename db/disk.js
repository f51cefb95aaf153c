import { existsSync, statfsSync } from 'node:fs'
import path from 'node:path'
import { StartFault } from './fault.js'

const MEGABYTE = 1_000_000

/**
 * @param {string} folder may not exist yet
 * @param {number} neededBytes
 * @param {string} purpose
 */
export function requireDiskSpace(folder, neededBytes, purpose) {
  let existing = path.resolve(folder)
  while (!existsSync(existing)) existing = path.dirname(existing)
  const { bavail, bsize } = statfsSync(existing)
  const free = bavail * bsize
  if (free >= neededBytes) return
  throw new StartFault(
    `The disk is full: ${purpose} needs ${Math.ceil(neededBytes / MEGABYTE)} MB and ${Math.floor(free / MEGABYTE)} MB are free at ${existing}; free some space and start again, nothing was lost.`,
  )
}

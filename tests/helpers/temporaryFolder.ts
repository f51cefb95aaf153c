import { mkdtempSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import path from 'node:path'
import { onTestFinished } from 'vitest'

/** A folder for the running test only. */
export function temporaryFolder(): string {
  const folder = mkdtempSync(path.join(tmpdir(), 'evenstrung-test-'))
  onTestFinished(() => rmSync(folder, { recursive: true, force: true }))
  return folder
}

import { expect, test } from 'vitest'
import { requireDiskSpace } from '../../db/disk.js'
import { temporaryFolder } from '../helpers/temporaryFolder.ts'

test('requireDiskSpace() looks at the nearest folder that exists', () => {
  expect(() => requireDiskSpace(`${temporaryFolder()}/not/yet/there`, 1, 'the database')).not.toThrow()
})

test('requireDiskSpace() says how much is needed, how much is free, and that nothing was lost', () => {
  const folder = temporaryFolder()
  expect(() => requireDiskSpace(folder, 1e18, 'a new database')).toThrow(
    /^The disk is full: a new database needs 1000000000000 MB and \d+ MB are free at .*nothing was lost\.$/,
  )
})

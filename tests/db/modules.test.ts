import { mkdirSync, writeFileSync } from 'node:fs'
import path from 'node:path'
import { expect, test } from 'vitest'
import { modulesAreCurrent } from '../../db/modules.js'
import { temporaryFolder } from '../helpers/temporaryFolder.ts'

type Packages = Record<string, { version?: string; optional?: boolean }>

function checkout(wanted: Packages, installed?: Packages): string {
  const folder = temporaryFolder()
  writeFileSync(path.join(folder, 'package-lock.json'), JSON.stringify({ packages: wanted }))
  if (installed) {
    mkdirSync(path.join(folder, 'node_modules'))
    writeFileSync(
      path.join(folder, 'node_modules', '.package-lock.json'),
      JSON.stringify({ packages: installed }),
    )
  }
  return folder
}

const wanted: Packages = {
  '': { version: '0.1.0' },
  'node_modules/a': { version: '1.0.0' },
  'node_modules/other-system': { version: '2.0.0', optional: true },
}

test('modulesAreCurrent() when all that the lock asks for is there, optional parts of other systems aside', () => {
  expect(modulesAreCurrent(checkout(wanted, { 'node_modules/a': { version: '1.0.0' } }))).toBe(true)
})

test('modulesAreCurrent() is false for nothing installed, another version, or an interrupted install', () => {
  expect(modulesAreCurrent(checkout(wanted))).toBe(false)
  expect(modulesAreCurrent(checkout(wanted, { 'node_modules/a': { version: '1.0.1' } }))).toBe(false)
  expect(modulesAreCurrent(checkout(wanted, {}))).toBe(false)
})

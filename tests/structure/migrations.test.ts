import { expect, test } from 'vitest'
import { MIGRATIONS } from '../../db/migrations/index.ts'
import { contentOf, projectFiles } from '../helpers/sources.ts'

const files = projectFiles().filter((file) => /^db\/migrations\/.*\.ts$/.test(file))
const steps = files.filter((file) => /^db\/migrations\/\d/.test(file))

test('a migration is named YYYYMMDDHHMM_what_changes.ts', () => {
  expect(steps.length).toBeGreaterThan(0)
  for (const file of steps)
    expect(file).toMatch(/^db\/migrations\/20\d{2}[01]\d[0-3]\d[0-2]\d[0-5]\d_[a-z0-9_]+\.ts$/)
})

test('every migration is listed once, in order, by its name without extension', () => {
  const names = steps.map((file) => file.replace(/^db\/migrations\/(.*)\.ts$/, '$1'))
  expect(MIGRATIONS.map(([name]) => name)).toEqual(names)
})

test('every migration can go forward and back', () => {
  for (const [, migration] of MIGRATIONS) {
    expect(migration.up).toBeTypeOf('function')
    expect(migration.down).toBeTypeOf('function')
  }
})

test('a migration reads no clock, no environment and no randomness', () => {
  for (const file of steps)
    expect(contentOf(file)).not.toMatch(/process\.env|Date\.now|Math\.random|new Date\(\)/)
})

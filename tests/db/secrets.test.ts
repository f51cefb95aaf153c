import { chmodSync, readFileSync, statSync, writeFileSync } from 'node:fs'
import path from 'node:path'
import { expect, test } from 'vitest'
import { readSecrets, updateSecrets } from '../../db/secrets.js'
import { temporaryFolder } from '../helpers/temporaryFolder.ts'

const modeOf = (file: string) => statSync(file).mode & 0o777

test('readSecrets() makes them on the first call, different ones, for the owner only', () => {
  const folder = temporaryFolder()
  const secrets = readSecrets(folder)
  const values = Object.values(secrets)
  expect(Object.keys(secrets).sort()).toEqual(['databaseAppPassword', 'databaseOwnerPassword', 'jwtSecret'])
  for (const value of values) expect(value).toMatch(/^[0-9a-f]{96}$/)
  expect(new Set(values).size).toBe(3)
  expect(modeOf(path.join(folder, 'secrets.json'))).toBe(0o600)
})

test('readSecrets() gives the same again and adds only what is missing', () => {
  const folder = temporaryFolder()
  const first = readSecrets(folder)
  expect(readSecrets(folder)).toEqual(first)
  writeFileSync(path.join(folder, 'secrets.json'), JSON.stringify({ jwtSecret: 'kept' }))
  expect(readSecrets(folder).jwtSecret).toBe('kept')
})

test('updateSecrets() keeps the others and closes a file that was left open', () => {
  const folder = temporaryFolder()
  const file = path.join(folder, 'secrets.json')
  const before = readSecrets(folder)
  chmodSync(file, 0o644)
  updateSecrets(folder, { benchTokens: { window: 'a', door: 'b' } })
  expect(readSecrets(folder)).toEqual({ ...before, benchTokens: { window: 'a', door: 'b' } })
  expect(modeOf(file)).toBe(0o600)
})

test('readSecrets() names a damaged file and leaves it as it is', () => {
  const folder = temporaryFolder()
  const file = path.join(folder, 'secrets.json')
  writeFileSync(file, '{ "jwtSecret": ')
  expect(() => readSecrets(folder)).toThrow(`The secrets file ${file} cannot be read`)
  expect(readFileSync(file, 'utf8')).toBe('{ "jwtSecret": ')
})

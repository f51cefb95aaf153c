import { readFileSync, statSync, writeFileSync } from 'node:fs'
import path from 'node:path'
import knex from 'knex'
import { expect, onTestFinished, test } from 'vitest'
import { isWholeDump, loadDump, query, writeDump } from '../../db/dump.js'
import { createEmptyDatabase } from '../helpers/emptyDatabase.ts'
import { temporaryFolder } from '../helpers/temporaryFolder.ts'

async function newDatabase() {
  const database = await createEmptyDatabase()
  onTestFinished(database.drop)
  return database
}

test.each(['copy.sql', 'copy.sql.gz'])(
  'a backup to %s brings back doubles, bytes and text to the last bit',
  async (name) => {
    const source = await newDatabase()
    const target = await newDatabase()
    const file = path.join(temporaryFolder(), name)
    const from = knex({ client: 'mysql2', connection: source.ownerUrl })
    const to = knex({ client: 'mysql2', connection: target.ownerUrl })
    onTestFinished(async () => {
      await from.destroy()
      await to.destroy()
    })
    const rows = [
      {
        id: 1,
        level_db: -23.456789012345678,
        trace: Buffer.from([0, 255, 39, 92, 10]),
        note: 'Häkchen ✓ \'"\\',
      },
      { id: 2, level_db: 5e-324, trace: Buffer.alloc(0), note: null },
      { id: 3, level_db: 0.1 + 0.2, trace: Buffer.alloc(200_000, 7), note: '' },
    ]
    await from.schema.createTable('things', (table) => {
      table.integer('id').primary()
      table.double('level_db')
      table.specificType('trace', 'LONGBLOB')
      table.text('note')
    })
    await from('things').insert(rows)

    await writeDump(source.ownerUrl, file)
    expect(statSync(file).mode & 0o777).toBe(0o600)
    expect(await isWholeDump(file, name.endsWith('.gz'))).toBe(true)
    await loadDump(target.ownerUrl, file, name.endsWith('.gz'))
    expect(await to('things').orderBy('id')).toEqual(rows)
  },
)

test('isWholeDump() is false for a backup that broke off', async () => {
  const source = await newDatabase()
  const file = path.join(temporaryFolder(), 'copy.sql')
  await writeDump(source.ownerUrl, file)
  const text = readFileSync(file, 'utf8')
  writeFileSync(file, text.slice(0, text.indexOf('-- Dump completed')))
  expect(await isWholeDump(file, false)).toBe(false)
})

test('writeDump() fails with the words of the database when it is not there', async () => {
  const source = await newDatabase()
  await source.drop()
  await expect(writeDump(source.ownerUrl, path.join(temporaryFolder(), 'copy.sql'))).rejects.toThrow(
    /^The backup failed: .*Unknown database/,
  )
})

test('query() answers a row a line', async () => {
  const { ownerUrl } = await newDatabase()
  expect(await query(ownerUrl, 'SELECT 1, 2 UNION SELECT 3, 4')).toBe('1\t2\n3\t4')
})

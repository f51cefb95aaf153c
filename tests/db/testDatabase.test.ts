import knex from 'knex'
import { expect, test } from 'vitest'
import { createEmptyDatabase } from '../helpers/emptyDatabase.ts'

test('a test database lets its owner make tables and shows nothing to the application', async () => {
  const database = await createEmptyDatabase()
  const owner = knex({ client: 'mysql2', connection: database.ownerUrl })
  const app = knex({ client: 'mysql2', connection: database.url.replace(database.name, '') })
  try {
    await owner.schema.createTable('things', (table) => table.increments('id'))
    await expect(app.raw('SELECT * FROM ??.things', [database.name])).rejects.toThrow(/denied/)
    await owner.raw("GRANT SELECT ON things TO 'evenstrung_app'@'127.0.0.1'")
    const [rows] = await app.raw('SELECT * FROM ??.things', [database.name])
    expect(rows).toEqual([])
  } finally {
    await owner.destroy()
    await app.destroy()
    await database.drop()
  }
})

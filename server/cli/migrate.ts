import { fileURLToPath } from 'node:url'
import type { Knex } from 'knex'
import { MIGRATIONS } from '../../db/migrations/index.ts'
import type { Migration } from '../../db/migrations/index.ts'
import { connect } from '../connect.ts'

const migrationSource: Knex.MigrationSource<readonly [string, Migration]> = {
  getMigrations: () => Promise.resolve([...MIGRATIONS]),
  getMigrationName: ([name]) => name,
  getMigration: ([, migration]) => Promise.resolve(migration),
}

/** Rows of these are only ever added: whoever holds the application's password cannot rewrite them. */
const INSERT_ONLY = ['audit_entries']

/**
 * Brings the schema to the latest and gives the application's user its rights, table by table.
 * `ownerUrl` names the user who owns the tables and may grant.
 */
export async function migrateDatabase(ownerUrl: string, appUser: string): Promise<string[]> {
  const knex = connect(ownerUrl, 1)
  try {
    const [, names] = (await knex.migrate.latest({ migrationSource })) as [number, string[]]
    await grantTables(knex, appUser)
    return names
  } finally {
    await knex.destroy()
  }
}

export async function rollbackDatabase(ownerUrl: string): Promise<string[]> {
  const knex = connect(ownerUrl, 1)
  try {
    const [, names] = (await knex.migrate.rollback({ migrationSource })) as [number, string[]]
    return names
  } finally {
    await knex.destroy()
  }
}

async function grantTables(knex: Knex, appUser: string): Promise<void> {
  const [rows] = (await knex.raw('SHOW TABLES')) as [Record<string, string>[]]
  for (const row of rows) {
    const table = Object.values(row)[0]!
    if (table.startsWith('knex_migrations')) continue
    const rights = INSERT_ONLY.includes(table) ? 'SELECT, INSERT' : 'SELECT, INSERT, UPDATE, DELETE'
    await knex.raw(`GRANT ${rights} ON ?? TO ?@'127.0.0.1'`, [table, appUser])
  }
}

async function main(): Promise<void> {
  const ownerUrl = process.env.DATABASE_OWNER_URL
  const appUrl = process.env.DATABASE_URL
  if (!ownerUrl || !appUrl) throw new Error('Set DATABASE_OWNER_URL and DATABASE_URL first.')
  if (process.argv.includes('--rollback')) {
    const names = await rollbackDatabase(ownerUrl)
    console.log(names.length ? `went back: ${names.join(', ')}` : 'nothing to go back to')
    return
  }
  const names = await migrateDatabase(ownerUrl, decodeURIComponent(new URL(appUrl).username))
  console.log(names.length ? `migrated: ${names.length} steps` : 'the database is up to date')
}

if (process.argv[1] === fileURLToPath(import.meta.url)) await main()

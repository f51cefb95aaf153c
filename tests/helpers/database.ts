import { migrateDatabase } from '../../server/cli/migrate.ts'
import { createEmptyDatabase } from './emptyDatabase.ts'
import type { TestDatabase } from './emptyDatabase.ts'

export type { TestDatabase }

const APP_USER = 'evenstrung_app'

/** A new schema of its own, migrated to the latest; call `drop` in `afterAll`. */
export async function createTestDatabase(): Promise<TestDatabase> {
  const database = await createEmptyDatabase()
  await migrateDatabase(database.ownerUrl, APP_USER)
  return database
}

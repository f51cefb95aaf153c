import type { Knex } from 'knex'
import { isStorageAway } from '../connect.ts'
import type { HandlersOf } from '../http/registry.ts'

/** `method` and `version` say which program answers. */
export function createHealthHandlers(
  knex: Knex,
  about: { method: number; version: string },
): HandlersOf<'health'> {
  const databaseAnswers = async (): Promise<boolean> => {
    try {
      await knex.raw('select 1')
      return true
    } catch (error) {
      if (isStorageAway(error)) return false
      throw error
    }
  }
  return {
    'health.read': async () => {
      const database = await databaseAnswers()
      return { ok: database, database, method: about.method, version: about.version }
    },
  }
}

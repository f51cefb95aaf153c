import type { Knex } from 'knex'
import type { HandlersOf } from '../http/registry.ts'
import { listModels } from './models.queries.ts'

export function createModelsHandlers(knex: Knex, now: () => Date): HandlersOf<'models'> {
  return { 'models.list': async () => ({ items: await listModels(knex, now()) }) }
}

import type { Knex } from 'knex'
import type { Config } from '../config.ts'
import { personOf } from '../http/registry.ts'
import type { HandlersOf } from '../http/registry.ts'
import { acknowledgeCautions, readCautions } from './cautions.service.ts'

export function createCautionsHandlers(knex: Knex, config: Config, now: () => Date): HandlersOf<'cautions'> {
  return {
    'cautions.read': (_input, context) => readCautions(knex, config, personOf(context).id, now()),
    'cautions.acknowledge': ({ body }, context) =>
      acknowledgeCautions(knex, config, { id: body.id, person: personOf(context) }, now()),
  }
}

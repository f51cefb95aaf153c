import type { Knex } from 'knex'
import type { HandlersOf } from '../http/registry.ts'
import { resolveScan } from './scan.service.ts'

export function createScanHandlers(knex: Knex): HandlersOf<'scan'> {
  return { 'scan.resolve': ({ params }) => resolveScan(knex, params.code) }
}

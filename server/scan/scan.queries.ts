import type { Knex } from 'knex'

export async function isRun(knex: Knex, id: string): Promise<boolean> {
  const row: unknown = await knex('runs').where({ id }).first('id')
  return row !== undefined
}

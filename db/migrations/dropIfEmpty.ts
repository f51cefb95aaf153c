import type { Knex } from 'knex'

/** A step back that would drop sealed data is refused. */
export async function dropIfEmpty(knex: Knex, table: string): Promise<void> {
  const row: unknown = await knex(table).first()
  if (row) throw new Error(`${table} holds data: take a backup and empty it on purpose before going back`)
  await knex.schema.dropTable(table)
}

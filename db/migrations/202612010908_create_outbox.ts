import type { Knex } from 'knex'
import { instant } from './columns.ts'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('outbox', (table) => {
    table.bigIncrements('id')
    table.string('kind', 40).notNullable()
    table.json('payload').notNullable()
    instant(table, 'created_at').notNullable()
    instant(table, 'sent_at')
    table.index(['sent_at', 'id'])
  })
}

export async function down(knex: Knex): Promise<void> {
  await knex.schema.dropTable('outbox')
}

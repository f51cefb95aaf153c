import type { Knex } from 'knex'
import { instant, uuid } from './columns.ts'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('caution_acknowledgements', (table) => {
    uuid(table, 'id').primary()
    uuid(table, 'user_id').notNullable().references('users.id')
    table.string('shift_key', 40).notNullable()
    instant(table, 'at').notNullable()
    table.unique(['user_id', 'shift_key'])
  })
}

export async function down(knex: Knex): Promise<void> {
  await knex.schema.dropTable('caution_acknowledgements')
}

import type { Knex } from 'knex'
import { uuid } from './columns.ts'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('user_roles', (table) => {
    table.increments('id')
    uuid(table, 'user_id').notNullable().references('users.id')
    table.string('role', 20).notNullable()
    table.unique(['user_id', 'role'])
  })
}

export async function down(knex: Knex): Promise<void> {
  await knex.schema.dropTable('user_roles')
}

import type { Knex } from 'knex'
import { instant, uuid } from './columns.ts'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('users', (table) => {
    uuid(table, 'id').primary()
    table.string('name', 120).notNullable()
    table.string('email', 200).notNullable().unique()
    table.string('password_hash', 100)
    table.boolean('is_demo').notNullable().defaultTo(false)
    instant(table, 'created_at').notNullable()
    instant(table, 'deactivated_at')
    table.integer('version').notNullable().defaultTo(1)
  })
}

export async function down(knex: Knex): Promise<void> {
  await knex.schema.dropTable('users')
}

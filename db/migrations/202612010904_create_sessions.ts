import type { Knex } from 'knex'
import { instant, uuid } from './columns.ts'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('sessions', (table) => {
    uuid(table, 'id').primary()
    uuid(table, 'user_id').notNullable().references('users.id')
    instant(table, 'created_at').notNullable()
    instant(table, 'last_used_at').notNullable()
    instant(table, 'expires_at').notNullable()
    instant(table, 'ended_at')
    table.string('end_reason', 40)
    table.string('user_agent', 200).notNullable()
    table.index(['user_id', 'ended_at'])
  })
}

export async function down(knex: Knex): Promise<void> {
  await knex.schema.dropTable('sessions')
}

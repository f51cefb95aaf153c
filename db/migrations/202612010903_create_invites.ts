import type { Knex } from 'knex'
import { instant, sha256, uuid } from './columns.ts'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('invites', (table) => {
    uuid(table, 'id').primary()
    uuid(table, 'user_id').notNullable().references('users.id')
    sha256(table, 'token_hash').notNullable().unique()
    instant(table, 'created_at').notNullable()
    instant(table, 'expires_at').notNullable()
    instant(table, 'used_at')
  })
}

export async function down(knex: Knex): Promise<void> {
  await knex.schema.dropTable('invites')
}

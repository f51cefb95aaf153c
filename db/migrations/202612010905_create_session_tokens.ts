import type { Knex } from 'knex'
import { instant, sha256, uuid } from './columns.ts'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('session_tokens', (table) => {
    table.bigIncrements('id')
    uuid(table, 'session_id').notNullable().references('sessions.id')
    sha256(table, 'token_hash').notNullable().unique()
    table.integer('generation').unsigned().notNullable()
    instant(table, 'issued_at').notNullable()
    instant(table, 'used_at')
    table.index(['session_id', 'generation'])
  })
}

export async function down(knex: Knex): Promise<void> {
  await knex.schema.dropTable('session_tokens')
}

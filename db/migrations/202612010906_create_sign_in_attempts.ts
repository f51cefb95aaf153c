import type { Knex } from 'knex'
import { instant, sha256 } from './columns.ts'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('sign_in_attempts', (table) => {
    table.bigIncrements('id')
    table.string('kind', 10).notNullable()
    sha256(table, 'subject_hash').notNullable()
    table.integer('failures').unsigned().notNullable()
    instant(table, 'last_failed_at').notNullable()
    table.unique(['kind', 'subject_hash'])
  })
}

export async function down(knex: Knex): Promise<void> {
  await knex.schema.dropTable('sign_in_attempts')
}

import type { Knex } from 'knex'
import { instant, uuid } from './columns.ts'
import { dropIfEmpty } from './dropIfEmpty.ts'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('audit_entries', (table) => {
    table.bigIncrements('id')
    instant(table, 'at').notNullable()
    uuid(table, 'user_id').references('users.id')
    table.string('actor', 120).notNullable()
    table.string('action', 60).notNullable()
    table.string('subject', 40).notNullable()
    table.string('subject_id', 64).notNullable()
    table.json('details').notNullable()
    table.index(['subject', 'subject_id'])
    table.index(['at'])
  })
}

export async function down(knex: Knex): Promise<void> {
  await dropIfEmpty(knex, 'audit_entries')
}

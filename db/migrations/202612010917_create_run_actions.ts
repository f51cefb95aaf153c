import type { Knex } from 'knex'
import { instant, uuid } from './columns.ts'
import { dropIfEmpty } from './dropIfEmpty.ts'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('run_actions', (table) => {
    uuid(table, 'id').primary()
    table.bigInteger('run_seq').unsigned().notNullable().references('runs.seq')
    table.integer('no').unsigned().notNullable()
    table.integer('frame').unsigned().notNullable()
    uuid(table, 'user_id').notNullable().references('users.id')
    table.string('person', 120).notNullable()
    instant(table, 'at').notNullable()
    table.json('action').notNullable()
    table.unique(['run_seq', 'no'])
  })
}

export async function down(knex: Knex): Promise<void> {
  await dropIfEmpty(knex, 'run_actions')
}

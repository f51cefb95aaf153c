import type { Knex } from 'knex'
import { instant, uuid } from './columns.ts'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('instruments', (table) => {
    uuid(table, 'id').primary()
    table.string('serial', 32).notNullable().unique()
    table.string('serial_folded', 32).notNullable().index()
    uuid(table, 'model_id').notNullable().references('models.id')
    instant(table, 'created_at').notNullable()
    table.integer('runs').unsigned().notNullable().defaultTo(0)
    uuid(table, 'last_run_id')
    instant(table, 'last_run_at')
    table.string('last_verdict', 4)
    table.index(['created_at', 'id'])
  })
}

export async function down(knex: Knex): Promise<void> {
  await knex.schema.dropTable('instruments')
}

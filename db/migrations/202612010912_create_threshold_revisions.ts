import type { Knex } from 'knex'
import { instant, uuid } from './columns.ts'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('threshold_revisions', (table) => {
    uuid(table, 'id').primary()
    uuid(table, 'model_id').notNullable().references('models.id')
    table.integer('revision').unsigned().notNullable()
    table.string('label', 40).notNullable().unique()
    table.string('status', 10).notNullable()
    instant(table, 'in_force_from')
    table.json('sheet').notNullable()
    uuid(table, 'proposed_by').references('users.id')
    uuid(table, 'put_in_force_by').references('users.id')
    instant(table, 'created_at').notNullable()
    table.unique(['model_id', 'revision'])
    table.index(['model_id', 'status', 'in_force_from'])
  })
}

export async function down(knex: Knex): Promise<void> {
  await knex.schema.dropTable('threshold_revisions')
}

import type { Knex } from 'knex'
import { uuid } from './columns.ts'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('models', (table) => {
    uuid(table, 'id').primary()
    table.string('key', 12).notNullable().unique()
    table.string('name', 80).notNullable()
    table.string('strings', 10).notNullable()
    table.string('handedness', 5).notNullable()
    table.string('circuit', 10).notNullable()
    table.string('jack_kind', 30).notNullable()
    table.json('tuning').notNullable()
    table.boolean('is_recording').notNullable()
    table.integer('version').notNullable().defaultTo(1)
  })
}

export async function down(knex: Knex): Promise<void> {
  await knex.schema.dropTable('models')
}

import type { Knex } from 'knex'
import { instant, uuid } from './columns.ts'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('bench_verifications', (table) => {
    uuid(table, 'id').primary()
    uuid(table, 'bench_id').notNullable().references('benches.id')
    instant(table, 'at').notNullable()
    uuid(table, 'user_id').references('users.id')
    table.string('by_name', 120).notNullable()
    table.string('check_standard', 80).notNullable()
    table.json('measurements').notNullable()
    table.boolean('passed').notNullable()
    table.json('reasons').notNullable()
    table.json('floor_db').notNullable()
    instant(table, 'valid_until')
    table.index(['bench_id', 'at'])
  })
}

export async function down(knex: Knex): Promise<void> {
  await knex.schema.dropTable('bench_verifications')
}

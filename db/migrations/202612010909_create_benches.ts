import type { Knex } from 'knex'
import { double, instant, sha256, uuid } from './columns.ts'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('benches', (table) => {
    uuid(table, 'id').primary()
    table.string('name', 60).notNullable().unique()
    table.string('code', 32).notNullable().unique()
    sha256(table, 'token_hash').unique()
    table.boolean('simulated').notNullable()
    table.string('channel_kind', 3)
    table.integer('mains_hz').notNullable()
    table.json('capabilities').notNullable()
    table.json('calibration_db').notNullable()
    double(table, 'u_cal_own_db').notNullable()
    double(table, 'u_cal_shared_db').notNullable()
    double(table, 'study_s_db')
    instant(table, 'created_at').notNullable()
    instant(table, 'last_connected_at')
    instant(table, 'retired_at')
    table.integer('version').notNullable().defaultTo(1)
  })
}

export async function down(knex: Knex): Promise<void> {
  await knex.schema.dropTable('benches')
}

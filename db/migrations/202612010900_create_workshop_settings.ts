import type { Knex } from 'knex'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('workshop_settings', (table) => {
    table.integer('id').unsigned().primary()
    table.string('name', 120).notNullable()
    table.string('time_zone', 60).notNullable()
    table.json('shifts').notNullable()
    table.string('serial_pattern', 60).notNullable()
    table.integer('version').notNullable().defaultTo(1)
  })
}

export async function down(knex: Knex): Promise<void> {
  await knex.schema.dropTable('workshop_settings')
}

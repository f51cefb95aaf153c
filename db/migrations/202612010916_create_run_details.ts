import type { Knex } from 'knex'
import { dropIfEmpty } from './dropIfEmpty.ts'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('run_details', (table) => {
    table.bigInteger('run_seq').unsigned().primary().references('runs.seq')
    table.json('setup').notNullable()
    table.json('measured')
  })
}

export async function down(knex: Knex): Promise<void> {
  await dropIfEmpty(knex, 'run_details')
}

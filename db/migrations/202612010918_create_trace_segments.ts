import type { Knex } from 'knex'
import { instant, sha256 } from './columns.ts'
import { dropIfEmpty } from './dropIfEmpty.ts'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('trace_segments', (table) => {
    table.bigIncrements('id')
    table.bigInteger('run_seq').unsigned().notNullable().references('runs.seq')
    table.integer('no').unsigned().notNullable()
    table.integer('from_frame').unsigned().notNullable()
    table.integer('frames').unsigned().notNullable()
    sha256(table, 'sha256').notNullable()
    table.specificType('data', 'LONGBLOB').notNullable()
    instant(table, 'committed_at').notNullable()
    table.unique(['run_seq', 'no'])
  })
}

export async function down(knex: Knex): Promise<void> {
  await dropIfEmpty(knex, 'trace_segments')
}

import type { Knex } from 'knex'
import { instant, uuid } from './columns.ts'
import { dropIfEmpty } from './dropIfEmpty.ts'

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('runs', (table) => {
    table.bigIncrements('seq')
    uuid(table, 'id').notNullable().unique()
    uuid(table, 'instrument_id').notNullable().references('instruments.id')
    uuid(table, 'model_id').notNullable().references('models.id')
    uuid(table, 'bench_id').notNullable().references('benches.id')
    uuid(table, 'opened_by').notNullable().references('users.id')
    uuid(table, 'sheet_id').notNullable().references('threshold_revisions.id')
    table.integer('method').unsigned().notNullable()
    table.string('reason', 20).notNullable()
    table.string('status', 12).notNullable()
    table.string('verdict', 4)
    instant(table, 'opened_at').notNullable()
    instant(table, 'ended_at')
    table.string('end_reason', 200)
    table.string('runtime', 60).notNullable()
    uuid(table, 'open_bench_id').unique()
    uuid(table, 'open_instrument_id').unique()
    table.index(['instrument_id', 'seq'])
    table.index(['opened_at', 'seq'])
  })
}

export async function down(knex: Knex): Promise<void> {
  await dropIfEmpty(knex, 'runs')
}

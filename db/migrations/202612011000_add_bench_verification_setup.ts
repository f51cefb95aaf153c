import type { Knex } from 'knex'

/** What was verified: a record without these tells of no known set-up and holds for none. */
export async function up(knex: Knex): Promise<void> {
  await knex.schema.alterTable('bench_verifications', (table) => {
    table.string('channel_kind', 8)
    table.json('capabilities')
    table.json('algorithms')
  })
}

export async function down(knex: Knex): Promise<void> {
  await knex.schema.alterTable('bench_verifications', (table) => {
    table.dropColumns('channel_kind', 'capabilities', 'algorithms')
  })
}

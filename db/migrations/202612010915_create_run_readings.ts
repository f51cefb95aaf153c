import type { Knex } from 'knex'
import { double } from './columns.ts'
import { dropIfEmpty } from './dropIfEmpty.ts'

/** Judged values and their standard uncertainty, in the rule's unit; element e under string e. */
const READINGS = [
  ...[1, 2, 3, 4, 5, 6].flatMap((e) => [
    `level_${e}`,
    `level_${e}_u`,
    `balance_${e}`,
    `balance_${e}_u`,
    `separation_${e}`,
    `s_${e}`,
  ]),
  'range',
  'range_u',
  'step',
  'step_u',
  'mean_level',
  'mean_level_u',
  'noise_flat',
  'noise_a',
  'hum',
  'sn_flat',
  'sn_a',
  'disturbance_count',
  'disturbance_longest',
  'contact_tip',
  'contact_ring',
  'contact_sleeve',
  'insulation',
  'current_plugged',
  'current_unplugged',
  'battery',
]

export async function up(knex: Knex): Promise<void> {
  await knex.schema.createTable('run_readings', (table) => {
    table.bigInteger('run_seq').unsigned().primary().references('runs.seq')
    for (const name of READINGS) double(table, name)
  })
}

export async function down(knex: Knex): Promise<void> {
  await dropIfEmpty(knex, 'run_readings')
}

import type { Knex } from 'knex'
import type { Person } from '../../src/shared/contract/auth.ts'
import type { Cautions } from '../../src/shared/contract/workshop.ts'
import { insertAudit } from '../audit/audit.queries.ts'
import type { Config } from '../config.ts'
import { isDuplicate } from '../connect.ts'
import { shiftKeyAt } from '../workshop/shiftKeyAt.ts'
import { findWorkshop } from '../workshop/workshop.queries.ts'
import { findAcknowledgedAt, insertAcknowledgement } from './cautions.queries.ts'

type ClockConfig = Pick<Config, 'workshopTimeZone'>

/** Cautions are read and accepted once per person and shift, before the first run. */
export async function readCautions(
  knex: Knex,
  config: ClockConfig,
  userId: string,
  now: Date,
): Promise<Cautions> {
  const shift = shiftKeyAt(now, await findWorkshop(knex, config.workshopTimeZone))
  const at = await findAcknowledgedAt(knex, userId, shift)
  return { acknowledged: at !== null, shift, acknowledgedAt: at?.toISOString() ?? null }
}

export async function isAcknowledged(
  knex: Knex,
  config: ClockConfig,
  userId: string,
  now: Date,
): Promise<boolean> {
  return (await readCautions(knex, config, userId, now)).acknowledged
}

export async function acknowledgeCautions(
  knex: Knex,
  config: ClockConfig,
  acknowledgement: { id: string; person: Person },
  now: Date,
): Promise<Cautions> {
  const { id, person } = acknowledgement
  const { shift } = await readCautions(knex, config, person.id, now)
  try {
    await knex.transaction(async (trx) => {
      const row = { id, userId: person.id, shiftKey: shift, at: now }
      if (!(await insertAcknowledgement(trx, row))) return
      const entry = { action: 'cautions.acknowledged', subject: 'shift', subjectId: shift, details: {} }
      await insertAudit(trx, { ...entry, userId: person.id, actor: person.name }, now)
    })
  } catch (error) {
    // The same person on two screens at once: the other one was first.
    if (!isDuplicate(error)) throw error
  }
  return readCautions(knex, config, person.id, now)
}

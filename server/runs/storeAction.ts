import type { Knex } from 'knex'
import type { RunAction } from '../../src/shared/contract/runs.ts'
import { isDuplicate } from '../connect.ts'
import { AppError } from '../errors.ts'
import type { OpenRun } from './openRun.ts'
import { deleteOtherActions, findActions } from './runs.queries.ts'

/**
 * Stores an action before it is answered. When the outcome of an insert is not known its person is told that it was
 * not stored; before anything else is stored the database is brought to say the same.
 */
export async function storeAction(knex: Knex, run: OpenRun, insert: () => Promise<unknown>): Promise<void> {
  try {
    if (run.actionsUncertain) await reconcile(knex, run)
    await insertOnce(knex, run, insert)
  } catch (error) {
    if (error instanceof AppError) throw error
    run.actionsUncertain = true
    throw error
  }
}

/** A place that is taken means that an earlier insert of unknown outcome came through after all. */
async function insertOnce(knex: Knex, run: OpenRun, insert: () => Promise<unknown>): Promise<void> {
  try {
    await insert()
  } catch (error) {
    if (!isDuplicate(error)) throw error
    await reconcile(knex, run)
    try {
      await insert()
    } catch (again) {
      if (isDuplicate(again)) throw new AppError('record.exists')
      throw again
    }
  }
}

/**
 * What is stored and not known here is removed, for its person was told that it was not stored. A change of person
 * is the exception: the run already has its new opener, so it is taken as having happened; it measures nothing.
 */
export async function reconcile(knex: Knex, run: OpenRun): Promise<void> {
  const known = new Set(run.actions.map((action) => action.id))
  const changes = (await findActions(knex, run.row.seq))
    .filter((action) => !known.has(action.id))
    .filter(isChange)
  for (const change of changes) {
    run.actions.push(change)
    run.row.openedBy = { id: change.userId, name: change.person }
  }
  await deleteOtherActions(
    knex,
    run.row.seq,
    run.actions.map((action) => action.id),
  )
  run.actionsUncertain = false
}

function isChange({ action }: RunAction): boolean {
  return action.kind === 'changePerson'
}

import { randomUUID } from 'node:crypto'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { insertAudit } from '../../../server/audit/audit.queries.ts'
import { connect } from '../../../server/connect.ts'
import { createTestDatabase } from '../../helpers/database.ts'
import type { TestDatabase } from '../../helpers/database.ts'

let database: TestDatabase
let knex: ReturnType<typeof connect>
beforeAll(async () => {
  database = await createTestDatabase()
  knex = connect(database.url, 2)
})
afterAll(async () => {
  await knex.destroy()
  await database.drop()
})

const entry = (subjectId: string) => ({
  userId: null,
  actor: 'test',
  action: 'thing.done',
  subject: 'thing',
  subjectId,
  details: { fields: ['phone'] },
})

describe('insertAudit()', () => {
  it('keeps who did what to which, and when', async () => {
    const subjectId = randomUUID()
    const at = new Date('2026-03-04T09:00:00.123Z')
    await insertAudit(knex, entry(subjectId), at)
    const row = await knex('audit_entries').where({ subject_id: subjectId }).first()
    expect(row).toMatchObject({ at, user_id: null, actor: 'test', action: 'thing.done', subject: 'thing' })
    expect(typeof row.details === 'string' ? JSON.parse(row.details) : row.details).toEqual({
      fields: ['phone'],
    })
  })

  it('goes away with the transaction that it tells of', async () => {
    const subjectId = randomUUID()
    await expect(
      knex.transaction(async (trx) => {
        await insertAudit(trx, entry(subjectId))
        throw new Error('undone')
      }),
    ).rejects.toThrow('undone')
    expect(await knex('audit_entries').where({ subject_id: subjectId })).toEqual([])
  })

  it('can be neither changed nor removed by the application’s database user', async () => {
    const subjectId = randomUUID()
    await insertAudit(knex, entry(subjectId))
    const row = () => knex('audit_entries').where({ subject_id: subjectId })
    await expect(row().update({ actor: 'someone else' })).rejects.toMatchObject({
      code: 'ER_TABLEACCESS_DENIED_ERROR',
    })
    await expect(row().delete()).rejects.toMatchObject({ code: 'ER_TABLEACCESS_DENIED_ERROR' })
    await expect(knex('audit_entries').truncate()).rejects.toMatchObject({
      code: 'ER_TABLEACCESS_DENIED_ERROR',
    })
    await expect(knex.schema.dropTable('audit_entries')).rejects.toMatchObject({
      code: 'ER_TABLEACCESS_DENIED_ERROR',
    })
    expect(await row()).toMatchObject([{ actor: 'test' }])
  })
})

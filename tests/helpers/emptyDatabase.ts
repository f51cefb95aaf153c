import { randomBytes } from 'node:crypto'
import knex from 'knex'
import type { Knex } from 'knex'
import { inject } from 'vitest'

export interface TestDatabase {
  name: string
  /** Address for the application's user, who has the rights that migrating grants. */
  url: string
  /** Address for the user who owns the tables. */
  ownerUrl: string
  drop: () => Promise<void>
}

/** A new schema of its own, before the first migration; call `drop` in `afterAll`. */
export async function createEmptyDatabase(): Promise<TestDatabase> {
  const name = `evenstrung_t_${randomBytes(6).toString('hex')}`
  await asOwner((owner) => owner.raw('CREATE DATABASE ??', [name]))
  return {
    name,
    url: inject('testDatabaseAppUrl') + name,
    ownerUrl: inject('testDatabaseOwnerUrl') + name,
    drop: () => asOwner((owner) => owner.raw('DROP DATABASE IF EXISTS ??', [name])),
  }
}

async function asOwner(work: (owner: Knex) => PromiseLike<unknown>) {
  const owner = knex({
    client: 'mysql2',
    connection: inject('testDatabaseOwnerUrl'),
    pool: { min: 0, max: 1 },
  })
  try {
    await work(owner)
  } finally {
    await owner.destroy()
  }
}

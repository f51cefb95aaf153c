import knex from 'knex'
import type { TestProject } from 'vitest/node'
import { joinTestDatabase } from '../db/testDatabase.js'

declare module 'vitest' {
  export interface ProvidedContext {
    testDatabaseOwnerUrl: string
    testDatabaseAppUrl: string
  }
}

/** Starts the database server of the tests, or joins the one that another run started. */
export default async function setup(project: TestProject) {
  const { server, isAlone, leave } = await joinTestDatabase()
  const ownerUrl = server.ownerUrl('')
  if (isAlone()) await dropLeftOverDatabases(ownerUrl)
  project.provide('testDatabaseOwnerUrl', ownerUrl)
  project.provide('testDatabaseAppUrl', server.appUrl(''))
  return async () => {
    await leave()
  }
}

async function dropLeftOverDatabases(ownerUrl: string) {
  const owner = knex({ client: 'mysql2', connection: ownerUrl, pool: { min: 0, max: 1 } })
  try {
    const rows = await owner('information_schema.schemata')
      .select({ name: 'schema_name' })
      .where('schema_name', 'like', 'evenstrung\\_t\\_%')
    for (const { name } of rows as { name: string }[]) await owner.raw('DROP DATABASE ??', [name])
  } finally {
    await owner.destroy()
  }
}

import { existsSync } from 'node:fs'
import path from 'node:path'
import { parseArgs } from 'node:util'
import { ensureBuilt } from '../build.js'
import { isWholeDump, loadDump, query } from '../dump.js'
import { built, ownerEnvironment } from '../environment.js'
import { StartFault } from '../fault.js'
import { ensureModules } from '../modules.js'
import { openDatabase } from '../openDatabase.js'
import { forgetPrepared } from '../prepared.js'
import { printLine, step } from '../progress.js'
import { runChild } from '../runChild.js'
import { isDataFolderClaimed } from '../running.js'
import { readSettings } from '../settings.js'

/** @param {string[]} args */
export async function run(args) {
  const { values, positionals } = parseArgs({
    args,
    allowPositionals: true,
    options: { into: { type: 'string' }, force: { type: 'boolean', default: false } },
  })
  const [fileName] = positionals
  if (!fileName)
    throw new StartFault(
      'Name the backup to read: npm run restore -- evenstrung.sql.gz [--into evenstrung_copy]',
    )
  const file = path.resolve(fileName)
  if (!existsSync(file)) throw new StartFault(`There is no file ${file}: check the name of the backup.`)
  const packed = file.endsWith('.gz')
  if (!(await isWholeDump(file, packed)))
    throw new StartFault(
      `${file} is not a whole backup (its last line is missing): use another; nothing was changed.`,
    )

  const settings = readSettings(values.into ? { ...process.env, DB_NAME: values.into } : process.env)
  if (!values.into && (await isDataFolderClaimed(settings.dataDir)))
    throw new StartFault('Evenstrung is running on this database: end it first, then restore.')
  await ensureModules()
  await ensureBuilt(['server'])
  const database = await openDatabase(settings)
  try {
    forgetPrepared(settings)
    const name = values.into ?? new URL(database.ownerUrl).pathname.slice(1)
    const addresses = {
      appUrl: withName(database.appUrl, name),
      ownerUrl: withName(database.ownerUrl, name),
    }
    await makeRoom(withName(addresses.ownerUrl, ''), name, values.force)
    await step(`Restoring ${file} into ${name}`, () => loadDump(addresses.ownerUrl, file, packed))
    // An older backup is brought up to date, and the application's user gets its rights on the tables.
    await runChild(process.execPath, [built('server/cli/migrate.js')], {
      env: ownerEnvironment(settings, addresses),
      what: 'Bringing the restored tables up to date',
    })
  } finally {
    await database.leave()
  }
  printLine(
    values.into
      ? `Restored beside the records in use. To work on the copy: DB_NAME=${settings.databaseName} npm run recompute -- --all`
      : 'Restored.',
  )
  return 0
}

/** @param {string} url @param {string} name */
function withName(url, name) {
  const changed = new URL(url)
  changed.pathname = `/${name}`
  return changed.href
}

/**
 * An empty database of that name; one that holds tables is only replaced when asked for.
 * @param {string} ownerUrl
 * @param {string} name
 * @param {boolean} force
 */
async function makeRoom(ownerUrl, name, force) {
  const tables = await query(
    ownerUrl,
    `SELECT COUNT(*) FROM information_schema.tables WHERE table_schema = '${name}'`,
  )
  if (Number(tables) > 0 && !force)
    throw new StartFault(
      `The database ${name} holds ${tables} tables and was not touched: restore beside it with --into evenstrung_copy, or replace it for good with --force.`,
    )
  await query(ownerUrl, `DROP DATABASE IF EXISTS \`${name}\`; CREATE DATABASE \`${name}\``)
}

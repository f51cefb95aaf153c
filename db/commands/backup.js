import { existsSync, renameSync, rmSync, statSync } from 'node:fs'
import path from 'node:path'
import { parseArgs } from 'node:util'
import { isWholeDump, writeDump } from '../dump.js'
import { StartFault } from '../fault.js'
import { openDatabase } from '../openDatabase.js'
import { printLine } from '../progress.js'
import { readSettings } from '../settings.js'

/** @param {string[]} args */
export async function run(args) {
  const { values, positionals } = parseArgs({
    args,
    allowPositionals: true,
    options: { force: { type: 'boolean', default: false } },
  })
  const [name] = positionals
  if (!name) throw new StartFault('Name the file to write: npm run backup -- evenstrung.sql.gz')
  const file = path.resolve(name)
  if (existsSync(file) && !values.force)
    throw new StartFault(`${file} is there already: choose another name, or add --force to replace it.`)
  const database = await openDatabase(readSettings())
  const draft = `${file}.part`
  try {
    rmSync(draft, { force: true })
    await writeDump(database.ownerUrl, draft)
    if (!(await isWholeDump(draft, file.endsWith('.gz'))))
      throw new StartFault(
        `The backup broke off: ${file} was not written; look for space on the disk and try again.`,
      )
    renameSync(draft, file)
  } finally {
    rmSync(draft, { force: true })
    await database.leave()
  }
  printLine(
    `Backup written: ${file}, ${(statSync(file).size / 1e6).toFixed(1)} MB. It holds personal data; keep it safe.`,
  )
  printLine(
    'The secrets (.data/secrets.json) are not in it: copy that file apart, so that benches need no new tokens.',
  )
  return 0
}

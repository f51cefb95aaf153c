import { ensureBuilt } from '../build.js'
import { appEnvironment, built, ownerEnvironment, ownerTools } from '../environment.js'
import { existsSync } from 'node:fs'
import { StartFault } from '../fault.js'
import { ensureModules } from '../modules.js'
import { openDatabase } from '../openDatabase.js'
import { forgetPrepared } from '../prepared.js'
import { readSettings } from '../settings.js'
import { runForeground } from '../runForeground.js'

/**
 * Runs a tool of server/cli with the database up; the private server is started for it and stopped after it.
 * @param {string[]} words name of the tool and its arguments
 */
export async function run([tool = '', ...args]) {
  const settings = readSettings()
  await ensureModules()
  await ensureBuilt(['server'])
  const script = built(`server/cli/${tool}.js`)
  if (!existsSync(script)) throw new StartFault(`There is no tool server/cli/${tool}.ts: check its name.`)
  const database = await openDatabase(settings)
  try {
    const changesTables = ownerTools.includes(tool)
    if (changesTables) forgetPrepared(settings)
    const environment = changesTables ? ownerEnvironment : appEnvironment
    return await runForeground([script, ...args], environment(settings, database))
  } finally {
    await database.leave()
  }
}

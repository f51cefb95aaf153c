import { existsSync } from 'node:fs'
import { ensureBuilt } from '../build.js'
import { built } from '../environment.js'
import { StartFault } from '../fault.js'
import { ensureModules } from '../modules.js'
import { runForeground } from '../runForeground.js'
import { readSettings } from '../settings.js'

/**
 * Runs a tool of simulator/cli. It speaks to a running server as any bench does.
 * @param {string[]} words name of the tool and its arguments
 */
export async function run([tool = '', ...args]) {
  const settings = readSettings()
  await ensureModules()
  await ensureBuilt(['simulator'])
  const script = built(`simulator/cli/${tool}.js`)
  if (!existsSync(script)) throw new StartFault(`There is no tool simulator/cli/${tool}.ts: check its name.`)
  return runForeground([script, ...args], {
    EVENSTRUNG_URL: `http://${settings.host}:${settings.port}`,
    ...process.env,
    DATA_DIR: settings.dataDir,
  })
}

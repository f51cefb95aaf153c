import { allTargets, ensureBuilt } from '../build.js'
import { ensureModules } from '../modules.js'

/** @returns {Promise<number>} */
export async function run() {
  await ensureModules()
  await ensureBuilt(allTargets)
  return 0
}

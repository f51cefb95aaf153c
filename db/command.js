import { StartFault, messageOf } from './fault.js'

/** @type {Record<string, () => Promise<{ run: (args: string[]) => Promise<number> }>>} */
const commands = {
  start: () => import('./commands/start.js'),
  dev: () => import('./commands/dev.js'),
  build: () => import('./commands/build.js'),
  test: () => import('./commands/test.js'),
  cli: () => import('./commands/cli.js'),
  simulator: () => import('./commands/simulator.js'),
  backup: () => import('./commands/backup.js'),
  restore: () => import('./commands/restore.js'),
}

/** @param {string[]} words the command's name and its arguments */
export async function main([name = '', ...args]) {
  try {
    const load = commands[name]
    if (!load)
      throw new StartFault(`There is no command '${name}': use one of ${Object.keys(commands).join(', ')}.`)
    const { run } = await load()
    process.exitCode = await run(args)
  } catch (error) {
    process.exitCode = 1
    process.stderr.write(`${messageOf(error)}\n`)
  }
}

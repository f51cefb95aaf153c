import { mkdirSync } from 'node:fs'
import path from 'node:path'
import { spawn } from 'node:child_process'
import { ensureBuilt } from '../build.js'
import { listenForEnd } from '../ending.js'
import { appEnvironment, built, ownerEnvironment } from '../environment.js'
import { ensureModules } from '../modules.js'
import { openDatabase } from '../openDatabase.js'
import { requireFreePort } from '../ports.js'
import { endProcess } from '../processes.js'
import { printLine } from '../progress.js'
import { runChild } from '../runChild.js'
import { claimDataFolder } from '../running.js'
import { projectDir, readSettings } from '../settings.js'
import { waitUntilHealthy } from '../supervise.js'
import { demoBenches } from './start.js'

const HEALTH_PATIENCE_MS = 60_000

/**
 * Client with hot reload on PORT, server on the next port and restarted when its sources change, simulated benches.
 * @returns {Promise<number>}
 */
export async function run() {
  const ending = listenForEnd()
  const settings = readSettings()
  const serverSettings = { ...settings, port: settings.port + 1 }
  mkdirSync(settings.dataDir, { recursive: true })
  const claim = await claimDataFolder(settings.dataDir)
  await requireFreePort(settings.port, settings.host, 'PORT')
  await requireFreePort(serverSettings.port, settings.host, 'PORT')
  await ensureModules()
  // The workers run from the bundle, also beside a server that runs from its sources.
  await ensureBuilt(['server'])
  const database = await openDatabase(settings)
  /** @type {ReturnType<typeof startShown>[]} */
  const children = []
  try {
    for (const [tool, env] of /** @type {const} */ ([
      ['migrate', ownerEnvironment(serverSettings, database)],
      ['seed', appEnvironment(serverSettings, database)],
    ]))
      await runChild(process.execPath, [built(`server/cli/${tool}.js`)], {
        env,
        signal: ending.signal,
        show: true,
        what: tool,
      })
    const url = `http://${settings.host}:${serverSettings.port}`
    const env = { ...appEnvironment(serverSettings, database), NODE_ENV: 'development', EVENSTRUNG_URL: url }
    const tsx = path.join(projectDir, 'node_modules', 'tsx', 'dist', 'cli.mjs')
    const vite = path.join(projectDir, 'node_modules', 'vite', 'bin', 'vite.js')
    const server = startShown('server', [tsx, 'watch', '--clear-screen=false', 'server/main.ts'], env)
    children.push(server)
    await waitUntilHealthy(url, server, { patienceMs: HEALTH_PATIENCE_MS, signal: ending.signal })
    for (const bench of demoBenches)
      children.push(
        startShown(
          `bench ${bench}`,
          [tsx, 'watch', '--clear-screen=false', 'simulator/main.ts', '--bench', bench],
          env,
        ),
      )
    children.push(startShown('client', [vite], { ...env, PORT: String(settings.port) }))
    await Promise.race([
      new Promise((resolve) => ending.signal.addEventListener('abort', resolve, { once: true })),
      ...children.map(async (child) => printLine(`The ${child.name} ended ${await child.ended}.`)),
    ])
  } finally {
    for (const child of children.reverse()) await child.stop()
    await database.leave()
    await claim.release()
  }
  return 0
}

/**
 * A child whose words are shown here, each line with its name.
 * @param {string} name
 * @param {string[]} args
 * @param {NodeJS.ProcessEnv} env
 */
function startShown(name, args, env) {
  const child = spawn(process.execPath, args, {
    cwd: projectDir,
    env,
    stdio: ['ignore', 'pipe', 'pipe'],
    detached: true,
  })
  for (const stream of [child.stdout, child.stderr])
    stream.on('data', (chunk) => {
      for (const line of String(chunk).trimEnd().split('\n')) printLine(`${name.padEnd(12)} ${line}`)
    })
  let running = true
  /** @type {Promise<string>} */
  const ended = new Promise((resolve) => {
    child.once('error', (error) => resolve(error.message))
    child.once('exit', (code, signal) => resolve(signal ? `by ${signal}` : `with code ${code}`))
  })
  void ended.then(() => (running = false))
  return {
    name,
    pid: child.pid ?? 0,
    logFile: '',
    ended,
    isRunning: () => running,
    stop: async () => {
      if (running && child.pid) await endProcess(child.pid, 10_000)
    },
  }
}

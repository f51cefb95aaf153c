import { createHash } from 'node:crypto'
import { existsSync, mkdirSync, readFileSync, readdirSync, renameSync, rmSync, writeFileSync } from 'node:fs'
import path from 'node:path'
import { StartFault } from './fault.js'
import { withLock } from './lock.js'
import { step } from './progress.js'
import { runChild } from './runChild.js'
import { projectDir } from './settings.js'

/** @typedef {'client' | 'server' | 'simulator'} Target */

/** @type {Record<Target, { inputs: string[], build: (outDir: string, signal?: AbortSignal) => Promise<void> }>} */
const targets = {
  client: {
    inputs: ['src', 'public', 'index.html', 'vite.config.ts', 'package-lock.json'],
    build: buildClient,
  },
  server: {
    inputs: ['server', 'src/shared', 'db/migrations', 'db/seeds', 'db/build.js', 'package-lock.json'],
    build: (outDir) => bundle('server', outDir),
  },
  simulator: {
    inputs: ['simulator', 'src/shared', 'db/build.js', 'package-lock.json'],
    build: (outDir) => bundle('simulator', outDir),
  },
}

/** @type {Target[]} */
export const allTargets = ['server', 'simulator', 'client']

const distDir = path.join(projectDir, 'dist')
/** @param {Target} target */
const stampFile = (target) => path.join(distDir, `.${target}.stamp`)

/**
 * Builds those targets whose inputs changed since they were built last.
 * @param {Target[]} [wanted]
 * @param {{ signal?: AbortSignal, print?: import('./progress.js').Print }} [options]
 */
export async function ensureBuilt(wanted = allTargets, { signal, print } = {}) {
  await withLock(distDir, async () => {
    for (const target of wanted) {
      const fingerprint = fingerprintOf(targets[target].inputs)
      if (isBuilt(target, fingerprint)) continue
      await step(`Building the ${target}`, () => buildTarget(target, fingerprint, signal), { print })
    }
  })
}

/** @param {Target} target @param {string} fingerprint */
function isBuilt(target, fingerprint) {
  return (
    existsSync(path.join(distDir, target)) &&
    existsSync(stampFile(target)) &&
    readFileSync(stampFile(target), 'utf8') === fingerprint
  )
}

/** @param {Target} target @param {string} fingerprint @param {AbortSignal} [signal] */
async function buildTarget(target, fingerprint, signal) {
  mkdirSync(distDir, { recursive: true })
  const finished = path.join(distDir, target)
  const draft = `${finished}.new`
  rmSync(draft, { recursive: true, force: true })
  rmSync(stampFile(target), { force: true })
  await targets[target].build(draft, signal)
  rmSync(finished, { recursive: true, force: true })
  renameSync(draft, finished)
  writeFileSync(stampFile(target), fingerprint)
}

/** @param {string[]} inputs files and folders; one that is missing counts as empty */
export function fingerprintOf(inputs) {
  const hash = createHash('sha256')
  for (const file of inputs.flatMap((input) => filesIn(path.join(projectDir, input)))) {
    hash.update(`${path.relative(projectDir, file)}\0`)
    hash.update(createHash('sha256').update(readFileSync(file)).digest())
  }
  return hash.digest('hex')
}

/** @param {string} place @returns {string[]} sorted */
function filesIn(place) {
  if (!existsSync(place)) return []
  let entries
  try {
    entries = readdirSync(place, { withFileTypes: true, recursive: true })
  } catch (error) {
    if (error instanceof Error && 'code' in error && error.code === 'ENOTDIR') return [place]
    throw error
  }
  return entries
    .filter((entry) => entry.isFile())
    .map((entry) => path.join(entry.parentPath, entry.name))
    .sort()
}

/** @param {string} outDir @param {AbortSignal} [signal] */
async function buildClient(outDir, signal) {
  const vite = path.join(projectDir, 'node_modules', 'vite', 'bin', 'vite.js')
  await runChild(process.execPath, [vite, 'build', '--outDir', outDir, '--emptyOutDir'], {
    env: { ...process.env, NODE_ENV: 'production' },
    signal,
    what: 'Building the client',
  })
}

/**
 * Programs of a process: its main file, its workers (whose file names end in Worker) and its command-line tools.
 * @param {'server' | 'simulator'} name
 * @returns {Record<string, string>} source by output without extension
 */
export function entriesOf(name) {
  const root = path.join(projectDir, name)
  const sources = filesIn(root).filter((file) => file.endsWith('.ts') && !file.endsWith('.d.ts'))
  /** @type {Record<string, string>} */
  const entries = {}
  for (const source of sources) {
    const inside = path.relative(root, source).replace(/\.ts$/, '')
    if (inside === 'main' || /^cli\/[^/]+$/.test(inside)) entries[inside] = source
    else if (inside.endsWith('Worker')) entries[path.basename(inside)] = source
  }
  return entries
}

/** @param {'server' | 'simulator'} name @param {string} outDir */
async function bundle(name, outDir) {
  const entryPoints = entriesOf(name)
  if (!entryPoints.main) throw new StartFault(`${name}/main.ts is missing: the checkout is not complete.`)
  const esbuild = await import('esbuild')
  try {
    await esbuild.build({
      absWorkingDir: projectDir,
      entryPoints,
      outdir: outDir,
      bundle: true,
      format: 'esm',
      platform: 'node',
      target: 'node20.19',
      packages: 'external',
      sourcemap: true,
      logLevel: 'silent',
    })
  } catch (error) {
    throw new StartFault(
      `${error instanceof Error ? error.message : String(error)}\nBuilding the ${name} failed: mend what stands above, then run the same command again.`,
      { cause: error },
    )
  } finally {
    await esbuild.stop()
  }
}

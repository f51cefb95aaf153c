import { createHash } from 'node:crypto'
import { existsSync } from 'node:fs'
import { mkdir, readFile, rename, writeFile } from 'node:fs/promises'
import path from 'node:path'
import { fileURLToPath } from 'node:url'

const here = fileURLToPath(import.meta.url)

/**
 * Where the worker's program stands. In the bundle it lies beside main.js and above the tools of cli/. From sources
 * (tests, dev) Node cannot start a worker in TypeScript, so it is bundled into the cache, named by its content.
 */
export async function passwordWorkerFile(): Promise<string> {
  if (here.endsWith('.ts')) return bundledFromSource(path.join(path.dirname(here), 'passwordWorker.ts'))
  const places = ['.', '..'].map((step) => path.join(path.dirname(here), step, 'passwordWorker.js'))
  const found = places.find((place) => existsSync(place))
  if (!found) throw new Error('passwordWorker.js is missing from the build: run npm run build')
  return found
}

async function bundledFromSource(source: string): Promise<string> {
  const content = await readFile(source)
  const fingerprint = createHash('sha256').update(content).digest('hex').slice(0, 16)
  const folder = path.join(path.dirname(here), '../../node_modules/.cache/evenstrung')
  const target = path.join(folder, `passwordWorker-${fingerprint}.mjs`)
  if (existsSync(target)) return target
  const { build } = await import('esbuild')
  const built = await build({
    entryPoints: [source],
    bundle: true,
    format: 'esm',
    platform: 'node',
    target: 'node20',
    write: false,
    logLevel: 'silent',
  })
  await mkdir(folder, { recursive: true })
  const draft = `${target}.${process.pid}`
  await writeFile(draft, built.outputFiles[0]!.contents)
  await rename(draft, target)
  return target
}

import { spawn } from 'node:child_process'
import type { ChildProcess } from 'node:child_process'
import { once } from 'node:events'
import { readFileSync, statSync } from 'node:fs'
import { createServer } from 'node:http'
import path from 'node:path'
import { beforeAll, expect, onTestFinished, test } from 'vitest'
import { ensureBuilt } from '../../../db/build.js'
import { nextFreePort } from '../../../db/ports.js'
import { findProcesses, waitForEnd } from '../../../db/processes.js'
import { projectDir } from '../../helpers/sources.ts'
import { temporaryFolder } from '../../helpers/temporaryFolder.ts'

const PATIENCE_MS = 120_000

interface Place {
  dataDir: string
  port: number
  databasePort: number
}

async function newPlace(): Promise<Place> {
  const port = await nextFreePort(23_100, '127.0.0.1')
  return {
    dataDir: path.join(temporaryFolder(), 'data'),
    port,
    databasePort: await nextFreePort(23_600, '127.0.0.1'),
  }
}

/** Starts as a person would, without npm in between. */
function start({ dataDir, port, databasePort }: Place, settings: Record<string, string> = {}) {
  const child = spawn(process.execPath, [path.join(projectDir, 'db', 'run.cjs'), 'start'], {
    env: {
      PATH: process.env.PATH,
      HOME: process.env.HOME,
      DATA_DIR: dataDir,
      PORT: String(port),
      DB_PORT: String(databasePort),
      ...settings,
    },
    stdio: ['ignore', 'pipe', 'pipe'],
  })
  let output = ''
  child.stdout.on('data', (chunk) => (output += chunk))
  child.stderr.on('data', (chunk) => (output += chunk))
  const ended = once(child, 'close')
  onTestFinished(async () => {
    child.kill('SIGTERM')
    await ended
  })
  return {
    child,
    ended,
    output: () => output,
    ready: () => untilSays(child, () => output, 'Ctrl-C ends everything'),
  }
}

/** Waits until the output holds some words; its end without them is a failure. */
function untilSays(child: ChildProcess, output: () => string, words: string): Promise<void> {
  return new Promise((resolve, reject) => {
    const look = () => {
      if (output().includes(words)) resolve()
    }
    child.stdout?.on('data', look)
    child.once('close', () => reject(new Error(`ended without '${words}':\n${output()}`)))
    look()
  })
}

const processesOf = ({ dataDir }: Place) =>
  findProcesses((args) => args.some((arg) => arg.includes(dataDir))).map(({ pid }) => pid)

beforeAll(() => ensureBuilt(undefined, { print: () => {} }), PATIENCE_MS)

test(
  'start brings up database, server and benches, refuses a second one, ends all of it, and is no production afterwards',
  async () => {
    const place = await newPlace()
    const first = start(place)
    await first.ready()
    const address = `http://127.0.0.1:${place.port}`
    expect(first.output()).toContain(address)
    expect(first.output()).toMatch(/admin@harrowlane\.test\s+\S+\s+admin/)
    expect(statSync(path.join(place.dataDir, 'secrets.json')).mode & 0o777).toBe(0o600)
    const page = await (await fetch(address)).text()
    expect(page).toContain('<div id="app"></div>')
    expect(page).not.toMatch(/<script(?![^>]*\bsrc=)/)
    const running = JSON.parse(readFileSync(path.join(place.dataDir, 'running.json'), 'utf8')) as {
      services: { name: string; pid: number }[]
    }
    expect(running.services.map(({ name }) => name)).toEqual(['server', 'bench window', 'bench door'])

    const second = start(place)
    expect(await second.ended).toEqual([1, null])
    expect(second.output()).toBe(
      `Evenstrung is already starting or running from ${place.dataDir} (process ${first.child.pid}, ${address}): use that one, end it with Ctrl-C there, or start a second one with its own DATA_DIR, PORT and DB_PORT.\n`,
    )

    first.child.kill('SIGINT')
    expect(await first.ended).toEqual([0, null])
    expect(first.output()).toMatch(/Ended\.\n$/)
    expect(processesOf(place)).toEqual([])
    for (const { pid } of running.services) expect(await waitForEnd(pid, 0)).toBe(true)

    const production = start(place, { EVENSTRUNG_MODE: 'production' })
    expect(await production.ended).toEqual([1, null])
    expect(production.output()).toMatch(/This database holds demo accounts/)
    expect(processesOf(place)).toEqual([])
  },
  PATIENCE_MS,
)

test(
  'start clears up after a launcher that was killed, and starts a killed server again',
  async () => {
    const place = await newPlace()
    const killed = start(place)
    await killed.ready()
    killed.child.kill('SIGKILL')
    await killed.ended

    const next = start(place)
    await next.ready()
    expect(next.output()).toContain('Ending the server that an earlier start left running')
    const { services } = JSON.parse(readFileSync(path.join(place.dataDir, 'running.json'), 'utf8')) as {
      services: { name: string; pid: number }[]
    }
    process.kill(services.find(({ name }) => name === 'server')?.pid ?? NaN, 'SIGKILL')
    await untilSays(next.child, next.output, 'The server ended by SIGKILL; it starts again')
  },
  PATIENCE_MS,
)

test(
  'start says which setting moves a taken port',
  async () => {
    const place = await newPlace()
    const other = createServer().listen(place.port, '127.0.0.1')
    await once(other, 'listening')
    onTestFinished(() => void other.close())
    const { ended, output } = start(place)
    expect(await ended).toEqual([1, null])
    expect(output()).toBe(
      `Port ${place.port} is taken by another program: end that program, or choose another port, for instance PORT=${place.port + 10}.\n`,
    )
  },
  PATIENCE_MS,
)

test(
  'start in production seeds nothing and starts no bench',
  async () => {
    const clean = await newPlace()
    const production = start(clean, { EVENSTRUNG_MODE: 'production' })
    await production.ready()
    expect(production.output()).not.toMatch(/harrowlane/)
    const running = JSON.parse(readFileSync(path.join(clean.dataDir, 'running.json'), 'utf8')) as {
      services: { name: string }[]
    }
    expect(running.services.map(({ name }) => name)).toEqual(['server'])
  },
  PATIENCE_MS,
)

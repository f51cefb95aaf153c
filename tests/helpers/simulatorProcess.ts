import { spawn } from 'node:child_process'
import path from 'node:path'
import { vi } from 'vitest'
import type { TestPerson } from './runningServer.ts'

/** The real bench program as a process of its own; end it with the function that comes back. */
export function startSimulator(url: string, token: string, args: string[]): () => void {
  const main = path.resolve(import.meta.dirname, '../../simulator/main.ts')
  const bench = spawn(process.execPath, ['--import', 'tsx', main, '--url', url, ...args], {
    env: { ...process.env, EVENSTRUNG_BENCH_TOKEN: token },
    stdio: ['ignore', 'ignore', 'inherit'],
  })
  return () => void bench.kill('SIGKILL')
}

/** Waits until the bench of that name is connected and has verified itself, and gives its id. */
export function benchReady(person: TestPerson, name: string): Promise<string> {
  return vi.waitFor(
    async () => {
      const bench = (await person.call('benches.list')).items.find((item) => item.name === name)
      if (!bench?.connected || !bench.verified) throw new Error(`bench ${name} is not ready yet`)
      return bench.id
    },
    { timeout: 30_000, interval: 100 },
  )
}

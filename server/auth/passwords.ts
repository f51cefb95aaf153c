import { Worker } from 'node:worker_threads'
import { MAX_PASSWORD_BYTES } from '../../src/shared/contract/auth.ts'
import type { Config } from '../config.ts'
import { AppError } from '../errors.ts'
import type { PasswordJob, PasswordJobDone } from './passwordWorker.ts'
import { passwordWorkerFile } from './passwordWorkerFile.ts'

export interface Passwords {
  hash: (password: string) => Promise<string>
  /** Without a hash (nobody of that name) the same work is done and the answer is no. */
  matches: (password: string, hash: string | null) => Promise<boolean>
  /** A hash of another cost than the setting's is made anew at the next sign-in. */
  isOutdated: (hash: string) => boolean
  close: () => Promise<void>
}

/** More waiting than this means an attack or a stuck machine; at cost 12 it is about 20 s. */
const MOST_WAITING = 50

type NewJob = PasswordJob extends infer Job ? (Job extends PasswordJob ? Omit<Job, 'id'> : never) : never

interface Waiting {
  resolve: (result: string | boolean) => void
  reject: (error: Error) => void
}

const costText = (cost: number) => String(cost).padStart(2, '0')

/** Hashes passwords in one worker, one after another, so that neither the event loop nor all cores are taken. */
export function createPasswords({ bcryptCost: cost }: Pick<Config, 'bcryptCost'>): Passwords {
  const waiting = new Map<number, Waiting>()
  let lastId = 0
  let worker: Promise<Worker> | null = null
  // Well-formed and of the set cost, so that comparing with it takes as long as with a real one; no password is known for it.
  const nobodysHash = `$2b$${costText(cost)}$${'Evenstrung0HasNoOneHere'.slice(0, 21)}u${'x'.repeat(31)}`

  const fail = (error: Error) => {
    worker = null
    for (const { reject } of waiting.values()) reject(error)
    waiting.clear()
  }

  const start = async (): Promise<Worker> => {
    const started = new Worker(await passwordWorkerFile())
    started.unref()
    started.on('message', (done: PasswordJobDone) => {
      const job = waiting.get(done.id)
      waiting.delete(done.id)
      if ('failed' in done) job?.reject(new Error(`password worker: ${done.failed}`))
      else job?.resolve(done.result)
      if (waiting.size === 0) started.unref()
    })
    started.on('error', (error) => fail(error instanceof Error ? error : new Error(String(error))))
    started.on('exit', () => fail(new Error('the password worker ended')))
    return started
  }

  const run = async (job: NewJob): Promise<string | boolean> => {
    if (waiting.size >= MOST_WAITING) throw new AppError('sign-in.wait', { facts: { waitSeconds: 10 } })
    const id = ++lastId
    const result = new Promise<string | boolean>((resolve, reject) => waiting.set(id, { resolve, reject }))
    try {
      worker ??= start()
      const ready = await worker
      ready.ref()
      ready.postMessage({ ...job, id })
    } catch (error) {
      fail(error instanceof Error ? error : new Error(String(error)))
    }
    return result
  }

  return {
    hash: async (password) => (await run({ kind: 'hash', password, cost })) as string,
    matches: async (password, hash) => {
      const same = await run({ kind: 'compare', password, hash: hash ?? nobodysHash })
      // bcrypt ignores what follows the 72nd byte: such a password was never set here.
      return same === true && hash !== null && Buffer.byteLength(password) <= MAX_PASSWORD_BYTES
    },
    isOutdated: (hash) => hash.slice(4, 6) !== costText(cost),
    close: async () => {
      const running = await worker
      await running?.terminate()
    },
  }
}

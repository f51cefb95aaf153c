import { parentPort } from 'node:worker_threads'
import { compareSync, hashSync } from 'bcryptjs'

export type PasswordJob =
  | { id: number; kind: 'hash'; password: string; cost: number }
  | { id: number; kind: 'compare'; password: string; hash: string }

export type PasswordJobDone = { id: number; result: string | boolean } | { id: number; failed: string }

const port = parentPort
if (!port) throw new Error('passwordWorker runs as a worker only')

function resultOf(job: PasswordJob): string | boolean {
  return job.kind === 'hash' ? hashSync(job.password, job.cost) : compareSync(job.password, job.hash)
}

port.on('message', (job: PasswordJob) => {
  let done: PasswordJobDone
  try {
    done = { id: job.id, result: resultOf(job) }
  } catch (error) {
    done = { id: job.id, failed: error instanceof Error ? error.message : String(error) }
  }
  port.postMessage(done)
})

import { spawn } from 'node:child_process'
import { once } from 'node:events'
import path from 'node:path'
import { pathToFileURL } from 'node:url'
import { expect, test } from 'vitest'
import { tryLock, withLock } from '../../db/lock.js'
import { projectDir } from '../helpers/sources.ts'
import { temporaryFolder } from '../helpers/temporaryFolder.ts'

test('tryLock() gives a path to one holder at a time', async () => {
  const subject = temporaryFolder()
  const first = await tryLock(subject)
  expect(first).toBeDefined()
  expect(await tryLock(subject)).toBeUndefined()
  const other = await tryLock(`${subject}/other`)
  expect(other).toBeDefined()
  await other?.release()
  await first?.release()
  const again = await tryLock(subject)
  expect(again).toBeDefined()
  await again?.release()
})

test('tryLock() is free again after its holder was killed', async () => {
  const subject = temporaryFolder()
  const lockFile = pathToFileURL(path.join(projectDir, 'db', 'lock.js')).href
  const program = `import { tryLock } from '${lockFile}'
await tryLock('${subject}')
console.log('held')
setInterval(() => {}, 1000)`
  const holder = spawn(process.execPath, ['--input-type=module', '-e', program], {
    stdio: ['ignore', 'pipe', 'inherit'],
  })
  await once(holder.stdout, 'data')
  expect(await tryLock(subject)).toBeUndefined()
  holder.kill('SIGKILL')
  await once(holder, 'exit')
  const lock = await tryLock(subject)
  expect(lock).toBeDefined()
  await lock?.release()
})

test('withLock() lets one after the other work', async () => {
  const subject = temporaryFolder()
  let inside = 0
  let most = 0
  const work = async () => {
    inside += 1
    most = Math.max(most, inside)
    await new Promise((resolve) => setImmediate(resolve))
    inside -= 1
  }
  await Promise.all([1, 2, 3, 4].map(() => withLock(subject, work)))
  expect(most).toBe(1)
})

test('withLock() gives up after its patience with one sentence, and frees the lock when the work fails', async () => {
  const subject = temporaryFolder()
  await expect(withLock(subject, () => Promise.reject(new Error('broken')))).rejects.toThrow('broken')
  await withLock(subject, async () => {
    await expect(withLock(subject, () => Promise.resolve(), { patienceMs: 60 })).rejects.toThrow(
      `Another process has been busy with ${subject}`,
    )
  })
})

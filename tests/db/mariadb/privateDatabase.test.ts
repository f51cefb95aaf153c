import { execFile } from 'node:child_process'
import { existsSync, mkdirSync, readdirSync, writeFileSync } from 'node:fs'
import { once } from 'node:events'
import { createServer } from 'node:net'
import path from 'node:path'
import { pathToFileURL } from 'node:url'
import { promisify } from 'node:util'
import { createConnection } from 'mysql2/promise'
import { expect, onTestFinished, test } from 'vitest'
import { findDaemon } from '../../../db/mariadb/daemon.js'
import { instanceIn, socketPathIn } from '../../../db/mariadb/instance.js'
import { joinDatabase, leaveDatabase } from '../../../db/mariadb/privateDatabase.js'
import { nextFreePort } from '../../../db/ports.js'
import { waitForEnd } from '../../../db/processes.js'
import { readSecrets, updateSecrets } from '../../../db/secrets.js'
import { projectDir } from '../../helpers/sources.ts'
import { temporaryFolder } from '../../helpers/temporaryFolder.ts'

const silent = { print: () => {} }

async function newInstance() {
  const folder = temporaryFolder()
  const instance = instanceIn({
    root: path.join(folder, 'mariadb'),
    port: await nextFreePort(22_400, '127.0.0.1'),
  })
  onTestFinished(async () => {
    await leaveDatabase(instance)
  })
  return { folder, instance, secrets: readSecrets(folder) }
}

async function ask(url: string, sql: string) {
  const connection = await createConnection(url)
  try {
    const [rows] = await connection.query(sql)
    return rows
  } finally {
    await connection.end()
  }
}

test('joinDatabase() makes a server with an owner and an application without rights; the last to leave stops it', async () => {
  const { instance, secrets } = await newInstance()
  mkdirSync(instance.unfinishedDir, { recursive: true })
  writeFileSync(path.join(instance.unfinishedDir, 'ibdata1'), 'half-made by an interrupted first start')

  const server = await joinDatabase(instance, secrets, silent)
  expect(existsSync(instance.unfinishedDir)).toBe(false)
  const owner = server.ownerUrl('evenstrung')
  expect(
    await ask(owner, 'SELECT @@sql_mode AS mode, @@time_zone AS zone, @@collation_database AS sorting'),
  ).toEqual([
    {
      mode: expect.stringContaining('STRICT_TRANS_TABLES') as string,
      zone: '+00:00',
      sorting: 'utf8mb4_unicode_ci',
    },
  ])
  await ask(owner, 'CREATE TABLE things (id INT PRIMARY KEY)')
  await expect(ask(server.appUrl('evenstrung'), 'SELECT * FROM things')).rejects.toThrow(/denied/)
  // Listening on loopback only, and no start file with passwords left behind.
  expect(await ask(owner, 'SELECT @@bind_address AS address')).toEqual([{ address: '127.0.0.1' }])
  expect(readdirSync(instance.root)).not.toContain('start.sql')

  expect(await leaveDatabase(instance)).toBe(true)
  expect(findDaemon(instance)).toBeUndefined()
})

test('joinDatabase() keeps what was committed when the server is killed, and heals changed passwords', async () => {
  const { folder, instance, secrets } = await newInstance()
  const first = await joinDatabase(instance, secrets, silent)
  await ask(first.ownerUrl('evenstrung'), 'CREATE TABLE things (id INT PRIMARY KEY)')
  await ask(first.ownerUrl('evenstrung'), 'INSERT INTO things VALUES (7)')
  process.kill(first.pid, 'SIGKILL')
  expect(await waitForEnd(first.pid, 10_000)).toBe(true)

  const changed = updateSecrets(folder, { databaseOwnerPassword: 'a'.repeat(40) })
  const second = await joinDatabase(instance, changed, silent)
  expect(second.pid).not.toBe(first.pid)
  expect(await ask(second.ownerUrl('evenstrung'), 'SELECT id FROM things')).toEqual([{ id: 7 }])
})

test('joinDatabase() from three processes at once gives one server', async () => {
  const { folder, instance } = await newInstance()
  const at = (file: string) => pathToFileURL(path.join(projectDir, 'db', file)).href
  const program = `import { instanceIn } from '${at('mariadb/instance.js')}'
import { joinDatabase, leaveDatabase } from '${at('mariadb/privateDatabase.js')}'
import { readSecrets } from '${at('secrets.js')}'
const instance = instanceIn({ root: '${instance.root}', port: ${instance.port} })
const server = await joinDatabase(instance, readSecrets('${folder}'), { print: () => {} })
console.log(server.pid)`
  const run = promisify(execFile)
  const joined = await Promise.all(
    [1, 2, 3].map(() => run(process.execPath, ['--input-type=module', '-e', program])),
  )
  const pids = joined.map(({ stdout }) => Number(stdout))
  expect(new Set(pids).size).toBe(1)
  expect(findDaemon(instance)?.pid).toBe(pids[0])
  // All three have ended without leaving: the next to leave sees that nobody is there any more.
  expect(await leaveDatabase(instance)).toBe(true)
})

test('joinDatabase() refuses an incomplete data folder and leaves it untouched', async () => {
  const { instance, secrets } = await newInstance()
  mkdirSync(path.join(instance.dataDir, 'mysql'), { recursive: true })
  writeFileSync(path.join(instance.dataDir, 'aria_log_control'), 'copied by hand, not all of it')
  const before = readdirSync(instance.dataDir)
  await expect(joinDatabase(instance, secrets, silent)).rejects.toThrow(
    `The database folder ${instance.dataDir} is incomplete (ibdata1 missing) and was not touched`,
  )
  expect(readdirSync(instance.dataDir)).toEqual(before)
})

test('joinDatabase() says which setting moves a taken port', async () => {
  const { instance, secrets } = await newInstance()
  const other = createServer().listen(instance.port, '127.0.0.1')
  await once(other, 'listening')
  onTestFinished(() => void other.close())
  await expect(joinDatabase(instance, secrets, silent)).rejects.toThrow(
    `Port ${instance.port} is taken by another program: end that program, or choose another port, for instance DB_PORT=${instance.port + 10}.`,
  )
})

test('socketPathIn() stays within 107 bytes, inside the folder where that is possible', () => {
  expect(socketPathIn('/home/a/evenstrung/.data/mariadb')).toBe('/home/a/evenstrung/.data/mariadb/db.sock')
  const deep = `/${'x'.repeat(200)}`
  expect(Buffer.byteLength(socketPathIn(deep))).toBeLessThanOrEqual(107)
  expect(socketPathIn(deep)).not.toBe(socketPathIn(`${deep}y`))
})

import { spawn } from 'node:child_process'
import { createReadStream, createWriteStream, openSync, readSync, closeSync, fstatSync } from 'node:fs'
import { pipeline } from 'node:stream/promises'
import { createGunzip, createGzip } from 'node:zlib'
import { StartFault } from './fault.js'
import { pathOfCommand } from './packages.js'

/** mariadb-dump writes this line last, and only when nothing is missing. */
const LAST_LINE = '-- Dump completed'

/** @param {string} url @returns {{ args: string[], env: NodeJS.ProcessEnv, name: string }} */
function connectionOf(url) {
  const { hostname, port, username, password, pathname } = new URL(url)
  return {
    args: [
      '--no-defaults',
      `--host=${hostname}`,
      `--port=${port || '3306'}`,
      '--protocol=TCP',
      `--user=${decodeURIComponent(username)}`,
      '--default-character-set=utf8mb4',
    ],
    // In the environment, because everybody on the machine can read a command line.
    env: { ...process.env, MYSQL_PWD: decodeURIComponent(password) },
    name: pathname.slice(1),
  }
}

/** @param {import('node:child_process').ChildProcess} child @param {string} what @returns {Promise<void>} */
function successOf(child, what) {
  let words = ''
  child.stderr?.on('data', (chunk) => (words += chunk))
  return new Promise((resolve, reject) => {
    child.once('error', reject)
    child.once('close', (code) => {
      if (code === 0) resolve()
      else reject(new StartFault(`${what} failed: ${words.trim()}`))
    })
  })
}

/**
 * Writes the whole database, as of one moment, to a file; gzip when its name ends in .gz.
 * @param {string} ownerUrl
 * @param {string} file
 */
export async function writeDump(ownerUrl, file) {
  const { args, env, name } = connectionOf(ownerUrl)
  const child = spawn(
    pathOfCommand('mariadb-dump'),
    [
      ...args,
      '--single-transaction',
      '--quick',
      '--hex-blob',
      '--triggers',
      '--no-tablespaces',
      '--max-allowed-packet=64M',
      name,
    ],
    { env, stdio: ['ignore', 'pipe', 'pipe'] },
  )
  const success = successOf(child, 'The backup')
  const sink = createWriteStream(file, { flags: 'wx', mode: 0o600 })
  const packed = file.replace(/\.part$/, '').endsWith('.gz') ? [createGzip()] : []
  await Promise.all([pipeline([child.stdout, ...packed, sink]), success])
}

/**
 * Whether a backup is whole: reads it to its last line.
 * @param {string} file
 * @param {boolean} packed
 */
export async function isWholeDump(file, packed) {
  if (!packed) return tailOf(file).includes(LAST_LINE)
  let tail = ''
  const unpacked = createReadStream(file).pipe(createGunzip())
  for await (const chunk of unpacked) tail = (tail + chunk).slice(-300)
  return tail.includes(LAST_LINE)
}

/** @param {string} file */
function tailOf(file) {
  const handle = openSync(file, 'r')
  try {
    const { size } = fstatSync(handle)
    const buffer = Buffer.alloc(Math.min(300, size))
    readSync(handle, buffer, 0, buffer.length, size - buffer.length)
    return buffer.toString('utf8')
  } finally {
    closeSync(handle)
  }
}

/** @param {string} ownerUrl @param {string} file @param {boolean} packed */
export async function loadDump(ownerUrl, file, packed) {
  const { args, env, name } = connectionOf(ownerUrl)
  const child = spawn(pathOfCommand('mariadb'), [...args, '--max-allowed-packet=64M', name], {
    env,
    stdio: ['pipe', 'ignore', 'pipe'],
  })
  const success = successOf(child, 'The restore')
  const unpacked = packed ? [createGunzip()] : []
  await Promise.all([pipeline([createReadStream(file), ...unpacked, child.stdin]), success])
}

/** @param {string} ownerUrl @param {string} statement @returns {Promise<string>} the answer, a row a line */
export async function query(ownerUrl, statement) {
  const { args, env } = connectionOf(ownerUrl)
  const child = spawn(
    pathOfCommand('mariadb'),
    [...args, '--batch', '--skip-column-names', '-e', statement],
    {
      env,
      stdio: ['ignore', 'pipe', 'pipe'],
    },
  )
  let answer = ''
  child.stdout.on('data', (chunk) => (answer += chunk))
  await successOf(child, 'Asking the database')
  return answer.trim()
}

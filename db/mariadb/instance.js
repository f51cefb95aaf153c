import { createHash } from 'node:crypto'
import { tmpdir } from 'node:os'
import path from 'node:path'

/**
 * A private database server: everything of it stands in one folder.
 * @typedef {object} Instance
 * @property {string} root
 * @property {string} dataDir
 * @property {string} unfinishedDir a first start works here, then renames it to dataDir
 * @property {string} tmpDir
 * @property {string} usersDir one file for each process that uses the server
 * @property {string} socket
 * @property {string} log
 * @property {number} port wished for; a server that already runs keeps its own
 * @property {boolean} durable every commit is on the disk before it is answered
 */

// sun_path of a socket address holds 108 bytes with its end mark.
const LONGEST_SOCKET_PATH = 107

/**
 * @param {{ root: string, port: number, durable?: boolean }} wish
 * @returns {Instance}
 */
export function instanceIn({ root, port, durable = true }) {
  return {
    root,
    dataDir: path.join(root, 'data'),
    unfinishedDir: path.join(root, 'data.new'),
    tmpDir: path.join(root, 'tmp'),
    usersDir: path.join(root, 'users'),
    socket: socketPathIn(root),
    log: path.join(root, 'mariadbd.log'),
    port,
    durable,
  }
}

/** @param {string} root */
export function socketPathIn(root) {
  const inside = path.join(root, 'db.sock')
  if (Buffer.byteLength(inside) <= LONGEST_SOCKET_PATH) return inside
  const short = createHash('sha256').update(root).digest('hex').slice(0, 16)
  return path.join(tmpdir(), `evenstrung-${short}.sock`)
}

import { connect as connectTcp, createServer } from 'node:net'
import type { Server, Socket } from 'node:net'
import { once } from 'node:events'
import { nextFreePort } from '../../db/ports.js'

/** A way to a TCP server that can be cut and mended, as when the database goes away and comes back. */
export async function createCuttableProxy(target: { host: string; port: number }) {
  const sockets = new Set<Socket>()
  let server: Server | null = null
  // Below the ephemeral range, so that no outgoing connection takes it while it is cut.
  const port = await nextFreePort(24_100 + (process.pid % 500), '127.0.0.1')

  const open = async () => {
    server = createServer((near) => {
      const far = connectTcp(target)
      for (const [one, other] of [
        [near, far],
        [far, near],
      ] as const) {
        sockets.add(one)
        one.pipe(other)
        one.on('error', () => other.destroy())
        one.on('close', () => {
          sockets.delete(one)
          other.destroy()
        })
      }
    })
    server.listen(port, '127.0.0.1')
    await once(server, 'listening')
  }

  const cut = async () => {
    const closing = server
    server = null
    for (const socket of sockets) socket.destroy()
    if (!closing) return
    closing.close()
    await once(closing, 'close')
  }

  await open()
  return { port, cut, mend: open }
}

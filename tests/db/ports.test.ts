import { once } from 'node:events'
import { createServer } from 'node:net'
import type { AddressInfo } from 'node:net'
import { expect, onTestFinished, test } from 'vitest'
import { nextFreePort, portProblem, requireFreePort } from '../../db/ports.js'

async function takenPort(): Promise<number> {
  const server = createServer()
  server.listen(await nextFreePort(21_000, '127.0.0.1'), '127.0.0.1')
  await once(server, 'listening')
  onTestFinished(() => void server.close())
  return (server.address() as AddressInfo).port
}

test('requireFreePort() says which port is taken and which setting moves it', async () => {
  const port = await takenPort()
  await expect(requireFreePort(port, '127.0.0.1', 'PORT')).rejects.toThrow(
    `Port ${port} is taken by another program: end that program, or choose another port, for instance PORT=${port + 10}.`,
  )
})

test('nextFreePort() passes over a taken one and stays below the outgoing range', async () => {
  const port = await takenPort()
  const free = await nextFreePort(port, '127.0.0.1')
  expect(free).toBeGreaterThan(port)
  expect(await portProblem(free, '127.0.0.1')).toBeUndefined()
  await expect(nextFreePort(32_768, '127.0.0.1')).rejects.toThrow(/No free port/)
})

test('requireFreePort() names an address that is not of this machine', async () => {
  await expect(requireFreePort(21_900, '192.0.2.1', 'PORT')).rejects.toThrow(/EADDRNOTAVAIL.*check HOST/)
})

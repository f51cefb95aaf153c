import { connect } from './connect.ts'
import { ConfigError, readConfig } from './config.ts'
import type { Config } from './config.ts'
import { createServer } from './createServer.ts'
import { createLog } from './log.ts'
import { refuseDemoAccounts } from './refuseDemoAccounts.ts'

/** Composition root: config, knex, services, app, sockets, listen, close. */
async function main(config: Config): Promise<void> {
  const log = createLog(config)
  const knex = connect(config.databaseUrl, 12)
  const server = await refuseDemoAccounts(knex, config)
    .then(() => createServer({ config, knex, log }))
    // An open pool would keep a refused server alive.
    .catch(async (error: unknown) => {
      await knex.destroy()
      throw error
    })

  let closing = false
  const close = async () => {
    if (closing) return
    closing = true
    log.info('closing')
    await server.close()
    await knex.destroy()
  }
  for (const signal of ['SIGINT', 'SIGTERM'] as const) process.on(signal, () => void close())

  server.http.on('error', (error: NodeJS.ErrnoException) => {
    const reason =
      error.code === 'EADDRINUSE'
        ? `Port ${config.port} is taken by another program: stop that one, or set PORT to a free port.`
        : error.message
    console.error(reason)
    process.exitCode = 1
    void close()
  })
  server.http.listen(config.port, config.host, () =>
    log.info({ port: config.port, host: config.host }, 'listening'),
  )
}

try {
  await main(readConfig(process.env))
} catch (error) {
  if (!(error instanceof ConfigError)) throw error
  console.error(error.message)
  process.exitCode = 1
}

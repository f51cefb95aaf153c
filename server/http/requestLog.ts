import { randomUUID } from 'node:crypto'
import type { RequestHandler } from 'express'
import type { Logger } from 'pino'

/**
 * One line a request. The route's key stands for the address, because addresses hold one-time tokens and search
 * words; headers, bodies, names and network addresses are never written.
 */
export function requestLog(log: Logger): RequestHandler {
  return (req, res, next) => {
    const requestId = randomUUID()
    const startedAt = process.hrtime.bigint()
    res.locals.requestId = requestId
    res.set('X-Request-Id', requestId)
    res.on('close', () => {
      const durationMs = Number((process.hrtime.bigint() - startedAt) / 1000n) / 1000
      const { route, userId, code } = res.locals as { route?: string; userId?: string; code?: string }
      // Files of the page are many and tell nothing.
      const level = route === undefined && res.statusCode < 400 ? 'debug' : 'info'
      log[level](
        {
          requestId,
          method: req.method,
          route: route ?? null,
          status: res.statusCode,
          code,
          userId,
          durationMs,
        },
        res.writableFinished ? 'answered' : 'caller went away',
      )
    })
    next()
  }
}

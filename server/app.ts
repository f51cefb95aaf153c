import express from 'express'
import type { Express } from 'express'
import { API } from '../src/shared/contract/routes.ts'
import { AppError } from './errors.ts'
import { clientFiles } from './http/clientFiles.ts'
import { errorHandler } from './http/errorHandler.ts'
import { mountRoutes } from './http/mountRoutes.ts'
import type { RouteDeps } from './http/mountRoutes.ts'
import { requestLog } from './http/requestLog.ts'
import { securityHeaders } from './http/securityHeaders.ts'

/** The whole HTTP side; it does not listen, so that a test can hold it. */
export function createApp(deps: RouteDeps): Express {
  const { config, log } = deps
  const app = express()
  app.disable('x-powered-by')
  app.disable('etag')
  app.set('trust proxy', config.trustProxy)
  app.use(requestLog(log))
  app.use(securityHeaders(config))
  app.use(API, mountRoutes(deps))
  app.use('/api', () => {
    throw new AppError('route.unknown')
  })
  app.use(clientFiles(config.clientDir))
  app.use(() => {
    throw new AppError('route.unknown')
  })
  app.use(errorHandler(log))
  return app
}

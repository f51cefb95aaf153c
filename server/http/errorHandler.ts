import type { ErrorRequestHandler } from 'express'
import type { Logger } from 'pino'
import { AppError, appErrorOf, problemOf } from '../errors.ts'
import { describeError } from './describeError.ts'

/** What Express and its body parser throw has a status of its own; it means that the caller sent nonsense. */
function translated(error: unknown): unknown {
  if (!(error instanceof Error) || error instanceof AppError) return error
  const { status, type } = error as { status?: unknown; type?: unknown }
  if (type === 'entity.too.large' || status === 413) return new AppError('request.too-large')
  if (type === 'encoding.unsupported' || type === 'charset.unsupported')
    return new AppError('request.malformed', { detail: 'Send UTF-8, not in this encoding.' })
  if (typeof status === 'number' && status >= 400 && status < 500) return new AppError('request.malformed')
  return error
}

/** The one place where a refusal becomes an HTTP answer. */
export function errorHandler(log: Logger): ErrorRequestHandler {
  return (thrown, _req, res, next) => {
    const error: unknown = translated(thrown)
    const requestId = res.locals.requestId as string
    const problem = problemOf(error, requestId)
    res.locals.code = problem.code
    if (problem.status >= 500) log.error({ requestId, error: describeError(error) }, problem.code)
    if (res.headersSent) {
      next(thrown)
      return
    }
    const waitSeconds = appErrorOf(error).details.facts?.waitSeconds
    if (typeof waitSeconds === 'number') res.set('Retry-After', String(waitSeconds))
    res.status(problem.status).type('application/problem+json').send(JSON.stringify(problem))
  }
}

import { Router, json } from 'express'
import type { Request, RequestHandler, Response } from 'express'
import type { Logger } from 'pino'
import { ROUTES } from '../../src/shared/contract/routes.ts'
import type { RouteContract, RouteKey } from '../../src/shared/contract/routes.ts'
import { requireAccess } from '../auth/requireAccess.ts'
import type { Sessions } from '../auth/sessions.ts'
import type { Config } from '../config.ts'
import { AppError } from '../errors.ts'
import { isOwnOrigin } from './origin.ts'
import { parseInput } from './parseInput.ts'
import type { Handlers, RequestContext } from './registry.ts'

export interface RouteDeps {
  config: Config
  handlers: Handlers
  sessions: Sessions
  log: Logger
}

const BODY_LIMIT = '256kb'

type AnyHandler = (input: unknown, context: RequestContext) => Promise<unknown>

/** Answers with thousands of points are not checked on the way out: that would cost more than making them. */
const UNCHECKED_ANSWERS: ReadonlySet<RouteKey> = new Set<RouteKey>(['runs.trace'])

/** Every route of the contract, each behind the same steps in the same order. */
export function mountRoutes(deps: RouteDeps): Router {
  const router = Router()
  const readBody = json({ limit: BODY_LIMIT })
  for (const key of Object.keys(ROUTES) as RouteKey[]) {
    const route: RouteContract = ROUTES[key]
    const steps: RequestHandler[] = [
      named(key),
      ...(route.method === 'get' ? [] : [ownOriginOnly(deps.config)]),
      withAccess(route, deps.sessions),
      // After the access check, so that strangers cannot make the server read bodies.
      ...(route.body ? [readBody] : []),
      answering(key, route, deps),
    ]
    router[route.method](route.path, ...steps)
  }
  return router
}

function named(key: RouteKey): RequestHandler {
  return (_req, res, next) => {
    res.locals.route = key
    res.set('Cache-Control', 'no-store')
    next()
  }
}

function ownOriginOnly(config: Config): RequestHandler {
  return (req, _res, next) => {
    if (!isOwnOrigin(req.headers, config)) throw new AppError('request.origin')
    next()
  }
}

function withAccess(route: RouteContract, sessions: Sessions): RequestHandler {
  return async (req, res, next) => {
    // A public route must answer even when the database, and with it the sign-in, is away.
    const signedIn = route.access === 'public' ? null : await sessions.personOfCookies(req.headers.cookie)
    requireAccess(route.access, signedIn?.person ?? null)
    res.locals.userId = signedIn?.person.id
    res.locals.signedIn = signedIn
    next()
  }
}

function contextOf(req: Request, res: Response): RequestContext {
  const signedIn = res.locals.signedIn as Awaited<ReturnType<Sessions['personOfCookies']>>
  return {
    person: signedIn?.person ?? null,
    sessionId: signedIn?.sessionId ?? null,
    tokenUntil: signedIn?.tokenUntil ?? null,
    requestId: res.locals.requestId as string,
    ip: req.ip ?? '',
    req,
    res,
  }
}

function answering(
  key: RouteKey,
  route: RouteContract,
  { config, handlers, log }: RouteDeps,
): RequestHandler {
  const handler = handlers[key] as AnyHandler
  const checksAnswer = config.mode === 'demo' && !UNCHECKED_ANSWERS.has(key)
  return async (req, res) => {
    const answer = await handler(parseInput(route, req), contextOf(req, res))
    if (checksAnswer) {
      const checked = route.answer.safeParse(answer)
      if (!checked.success) {
        const places = checked.error.issues.map(({ path, code }) => `${path.join('.')}: ${code}`)
        log.error(
          { requestId: res.locals.requestId as string, places },
          `answer of ${key} breaks its contract`,
        )
        throw new Error(`answer of ${key} breaks its contract`)
      }
    }
    res.status(route.status).json(answer)
  }
}

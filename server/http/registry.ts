import type { Request, Response } from 'express'
import type { Person } from '../../src/shared/contract/auth.ts'
import type {
  RouteAnswer,
  RouteBody,
  RouteKey,
  RouteParams,
  RouteQuery,
} from '../../src/shared/contract/routes.ts'

export interface RequestContext {
  person: Person | null
  sessionId: string | null
  /** ISO instant until which the short token lasts */
  tokenUntil: string | null
  requestId: string
  ip: string
  req: Request
  res: Response
}

export interface RouteInput<K extends RouteKey> {
  params: RouteParams<K>
  query: RouteQuery<K>
  body: RouteBody<K>
}

export type Handler<K extends RouteKey> = (
  input: RouteInput<K>,
  context: RequestContext,
) => Promise<RouteAnswer<K>>

/** One handler for each route of the contract: a route without one does not compile. */
export type Handlers = { [K in RouteKey]: Handler<K> }

/** The handlers of one noun: `HandlersOf<'auth' | 'invites'>`. */
export type HandlersOf<Noun extends string> = { [K in Extract<RouteKey, `${Noun}.${string}`>]: Handler<K> }

/** The person of a route that takes one: the registry has refused everyone else before the handler runs. */
export function personOf(context: RequestContext): Person {
  if (!context.person) throw new Error('a route that needs a person is declared public')
  return context.person
}

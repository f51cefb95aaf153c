import type { Knex } from 'knex'
import type { SignedIn } from '../../src/shared/contract/auth.ts'
import type { Config } from '../config.ts'
import { AppError } from '../errors.ts'
import { personOf } from '../http/registry.ts'
import type { HandlersOf, RequestContext } from '../http/registry.ts'
import { findWorkshop } from '../workshop/workshop.queries.ts'
import type { AuthService, Caller } from './auth.service.ts'
import { REFRESH_COOKIE, clearSignInCookies, cookieOf, setSignInCookies } from './cookies.ts'
import type { IssuedTokens, Sessions, SignedInPerson } from './sessions.ts'

export interface AuthHandlerDeps {
  knex: Knex
  auth: AuthService
  sessions: Sessions
  config: Config
}

const callerOf = ({ ip, req }: RequestContext): Caller => ({ ip, userAgent: req.get('user-agent') ?? '' })

function signedInOf(context: RequestContext): SignedInPerson {
  const { sessionId, tokenUntil } = context
  if (!sessionId || !tokenUntil) throw new Error('a route for those signed in is declared public')
  return { person: personOf(context), sessionId, tokenUntil }
}

export function createAuthHandlers({
  knex,
  auth,
  sessions,
  config,
}: AuthHandlerDeps): HandlersOf<'auth'> & HandlersOf<'invites'> {
  const withWorkshop = async ({ person, sessionId, tokenUntil }: SignedInPerson): Promise<SignedIn> => {
    const { name, timeZone } = await findWorkshop(knex, config.workshopTimeZone)
    return { person, sessionId, tokenUntil, workshop: { name, timeZone } }
  }

  const answer = (issued: IssuedTokens, { res }: RequestContext): Promise<SignedIn> => {
    setSignInCookies(res, issued, config)
    return withWorkshop(issued)
  }

  return {
    'auth.signIn': async ({ body }, context) =>
      answer(await auth.signIn(body.email, body.password, callerOf(context)), context),

    'auth.refresh': async (_input, context) => {
      try {
        const refreshToken = cookieOf(context.req.headers.cookie, REFRESH_COOKIE)
        return await answer(await sessions.refresh(refreshToken), context)
      } catch (error) {
        // Cookies that are of no more use; when the database is away they still are.
        if (error instanceof AppError) clearSignInCookies(context.res, config)
        throw error
      }
    },

    'auth.signOut': async ({ body }, context) => {
      await auth.signOut(signedInOf(context), body.everywhere)
      clearSignInCookies(context.res, config)
      return {}
    },

    'auth.me': (_input, context) => withWorkshop(signedInOf(context)),

    'invites.look': async ({ params }) => {
      const { name, email, expiresAt } = await auth.lookAtInvite(params.token)
      return { name, email, expiresAt: expiresAt.toISOString() }
    },

    'invites.accept': async ({ body }, context) =>
      answer(await auth.acceptInvite(body.token, body.password, callerOf(context)), context),
  }
}

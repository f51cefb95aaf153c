import { parse } from 'cookie'
import type { CookieOptions, Response } from 'express'
import { API } from '../../src/shared/contract/routes.ts'
import type { Config } from '../config.ts'

export const TOKEN_COOKIE = 'evenstrung_token'
export const REFRESH_COOKIE = 'evenstrung_refresh'

const DAY_MS = 86_400_000

type CookieConfig = Pick<Config, 'secureCookies' | 'tokenMinutes' | 'sessionDays'>

function optionsOf(config: CookieConfig): { token: CookieOptions; refresh: CookieOptions } {
  const common: CookieOptions = { httpOnly: true, sameSite: 'strict', secure: config.secureCookies }
  return {
    token: { ...common, path: '/' },
    // Goes only where it is exchanged, so that it is seldom on the wire.
    refresh: { ...common, path: `${API}/auth` },
  }
}

export function setSignInCookies(
  res: Response,
  tokens: { token: string; refreshToken: string },
  config: CookieConfig,
): void {
  const options = optionsOf(config)
  res.cookie(TOKEN_COOKIE, tokens.token, { ...options.token, maxAge: config.tokenMinutes * 60_000 })
  res.cookie(REFRESH_COOKIE, tokens.refreshToken, { ...options.refresh, maxAge: config.sessionDays * DAY_MS })
}

export function clearSignInCookies(res: Response, config: CookieConfig): void {
  const options = optionsOf(config)
  res.clearCookie(TOKEN_COOKIE, options.token)
  res.clearCookie(REFRESH_COOKIE, options.refresh)
}

/** One cookie out of a Cookie header; null when it is not there. */
export function cookieOf(header: string | undefined, name: string): string | null {
  return (header && parse(header)[name]) || null
}

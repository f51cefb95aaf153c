import type { Config } from '../config.ts'

export interface OriginHeaders {
  origin?: string | undefined
  host?: string | undefined
  'sec-fetch-site'?: string | string[] | undefined
}

/**
 * Whether a write or a socket upgrade comes from Evenstrung's own page. Every current browser sends Origin with
 * these, so one without it is not a browser and carries nobody's cookies by itself.
 */
export function isOwnOrigin(headers: OriginHeaders, config: Pick<Config, 'publicUrl'>): boolean {
  const { origin, host } = headers
  if (origin === undefined) {
    const site = headers['sec-fetch-site']
    return site === undefined || site === 'same-origin' || site === 'none'
  }
  if (origin === config.publicUrl) return true
  if (!URL.canParse(origin)) return false
  const url = new URL(origin)
  if (config.publicUrl?.startsWith('https:') && url.protocol !== 'https:') return false
  return url.host === host
}

import type { RequestHandler } from 'express'
import helmet from 'helmet'
import type { Config } from '../config.ts'

/** Scripts, fonts and connections of the own origin only; 'self' covers the web sockets of the same host. */
export function securityHeaders(config: Pick<Config, 'secureCookies'>): RequestHandler {
  return helmet({
    contentSecurityPolicy: {
      useDefaults: false,
      directives: {
        'default-src': ["'none'"],
        'script-src': ["'self'"],
        'script-src-attr': ["'none'"],
        'style-src': ["'self'"],
        // Element Plus writes style attributes; whole style sheets still come from files only.
        'style-src-attr': ["'unsafe-inline'"],
        'img-src': ["'self'", 'data:', 'blob:'],
        'font-src': ["'self'"],
        'connect-src': ["'self'"],
        'worker-src': ["'self'"],
        'manifest-src': ["'self'"],
        'form-action': ["'self'"],
        'base-uri': ["'none'"],
        'frame-ancestors': ["'none'"],
        ...(config.secureCookies ? { 'upgrade-insecure-requests': [] } : {}),
      },
    },
    // Over plain http browsers only complain about these two.
    crossOriginOpenerPolicy: config.secureCookies,
    strictTransportSecurity: config.secureCookies ? { maxAge: 31_536_000 } : false,
    // An invite's address must not travel to other sites; own requests keep their Origin.
    referrerPolicy: { policy: 'same-origin' },
    xFrameOptions: { action: 'deny' },
  })
}

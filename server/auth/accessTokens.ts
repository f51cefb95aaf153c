import { createSecretKey } from 'node:crypto'
import jwt from 'jsonwebtoken'
import { z } from 'zod'
import type { Config } from '../config.ts'

const ISSUER = 'evenstrung'
const Claims = z.object({ sub: z.uuid(), sid: z.uuid(), exp: z.int() })

export interface AccessTokens {
  issue: (userId: string, sessionId: string) => { token: string; until: Date }
  /** null: forged, damaged or run out */
  read: (token: string) => { userId: string; sessionId: string; until: Date } | null
}

export function createAccessTokens(
  config: Pick<Config, 'jwtSecret' | 'tokenMinutes'>,
  now: () => Date,
): AccessTokens {
  // As a KeyObject: with a string jsonwebtoken tries to read a private key each time, which is 40 times slower.
  const key = createSecretKey(Buffer.from(config.jwtSecret, 'utf8'))
  const nowSeconds = () => Math.floor(now().getTime() / 1000)
  return {
    issue: (userId, sessionId) => {
      const issuedAt = nowSeconds()
      const exp = issuedAt + config.tokenMinutes * 60
      const claims = { sub: userId, sid: sessionId, iat: issuedAt, exp, iss: ISSUER }
      return { token: jwt.sign(claims, key, { algorithm: 'HS256' }), until: new Date(exp * 1000) }
    },
    read: (token) => {
      try {
        const payload = jwt.verify(token, key, {
          algorithms: ['HS256'],
          issuer: ISSUER,
          clockTimestamp: nowSeconds(),
        })
        const { sub, sid, exp } = Claims.parse(payload)
        return { userId: sub, sessionId: sid, until: new Date(exp * 1000) }
      } catch (error) {
        if (error instanceof jwt.JsonWebTokenError || error instanceof z.ZodError) return null
        throw error
      }
    },
  }
}

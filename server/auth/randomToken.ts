import { createHash, randomBytes } from 'node:crypto'

/** 32 random bytes for an address or a cookie; only its SHA-256 is kept. */
export function randomToken(): { token: string; hash: Buffer } {
  const token = randomBytes(32).toString('base64url')
  return { token, hash: sha256(token) }
}

export function sha256(text: string): Buffer {
  return createHash('sha256').update(text, 'utf8').digest()
}

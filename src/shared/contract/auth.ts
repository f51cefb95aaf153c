import { z } from 'zod'
import { Id, Instant } from './quantities.ts'
import { Permission, Role } from './permissions.ts'

/** bcrypt reads 72 bytes and no more, so longer passwords are refused rather than cut. */
export const MIN_PASSWORD_CHARACTERS = 12
export const MAX_PASSWORD_BYTES = 72

export const Password = z
  .string()
  .min(MIN_PASSWORD_CHARACTERS, 'at least 12 characters')
  .refine((text) => utf8Bytes(text) <= MAX_PASSWORD_BYTES, 'at most 72 bytes')

export const Email = z
  .email()
  .max(200)
  .transform((text) => text.toLowerCase())

export const SignIn = z.object({ email: z.string().min(1).max(200), password: z.string().min(1).max(200) })
export type SignIn = z.infer<typeof SignIn>

export const Person = z.object({
  id: Id,
  name: z.string(),
  email: z.string(),
  roles: z.array(Role),
  permissions: z.array(Permission),
})
export type Person = z.infer<typeof Person>

/** Whose name the screens carry and whose clock they show; `timeZone` is an IANA name. */
export const Workshop = z.object({ name: z.string(), timeZone: z.string() })
export type Workshop = z.infer<typeof Workshop>

/** Who is signed in, and until when the short token lasts: the client refreshes before that. */
export const SignedIn = z.object({
  person: Person,
  tokenUntil: Instant,
  sessionId: Id,
  /** absent: dates are shown in the browser's time zone */
  workshop: Workshop.optional(),
})
export type SignedIn = z.infer<typeof SignedIn>

export const SignOut = z.object({ everywhere: z.boolean() })
export const AcceptInvite = z.object({ token: z.string().min(20).max(200), password: Password })
export const InviteLook = z.object({ name: z.string(), email: z.string(), expiresAt: Instant })

function utf8Bytes(text: string): number {
  let bytes = 0
  for (const character of text) {
    const point = character.codePointAt(0)!
    bytes += point < 0x80 ? 1 : point < 0x800 ? 2 : point < 0x10000 ? 3 : 4
  }
  return bytes
}

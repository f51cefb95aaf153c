/** Where to go after signing in: only a path of this application, never another site's address. */
export function safeNext(next: unknown): string {
  return typeof next === 'string' && /^\/(?![/\\])/.test(next) && !next.startsWith('/sign-in') ? next : '/'
}

import type { Person } from '../../src/shared/contract/auth.ts'
import { isAllowed } from '../../src/shared/contract/permissions.ts'
import type { Access } from '../../src/shared/contract/routes.ts'
import { AppError } from '../errors.ts'

/** Refuses whoever may not do this; the same for every route and every socket event. */
export function requireAccess(access: Access, person: Person | null): void {
  if (access === 'public') return
  if (!person) throw new AppError('sign-in.required')
  if (access !== 'signedIn' && !isAllowed(person.roles, access)) throw new AppError('permission.denied')
}

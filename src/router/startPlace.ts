import { useSessionStore } from '../stores/session.ts'

/** The section that a person's work begins with. */
export function startPlace(): { name: 'check' | 'instruments'; replace: true } {
  return { name: useSessionStore().may('runChecks') ? 'check' : 'instruments', replace: true }
}

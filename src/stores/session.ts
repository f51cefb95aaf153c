import { defineStore } from 'pinia'
import { computed, ref, shallowRef } from 'vue'
import { z } from 'zod'
import { toApiProblem } from '../api/apiProblem.ts'
import type { ApiProblem } from '../api/apiProblem.ts'
import { api, http } from '../api/http.ts'
import { live } from '../api/socket.ts'
import type { Person, SignedIn, Workshop } from '../shared/contract/auth.ts'
import type { RouteAnswer } from '../shared/contract/routes.ts'
import type { Permission } from '../shared/contract/permissions.ts'
import { keep, readKept } from './storage.ts'

/** unknown: not asked yet, or the server could not be reached */
export type SessionStatus = 'unknown' | 'in' | 'out'

/** Someone who has signed in at this terminal before: their name is offered, never their password. */
export const KnownPerson = z.object({ name: z.string(), email: z.string() })
export type KnownPerson = z.infer<typeof KnownPerson>
const MAX_KNOWN = 6

export const useSessionStore = defineStore('session', () => {
  const status = ref<SessionStatus>('unknown')
  const person = shallowRef<Person | null>(null)
  const workshop = shallowRef<Workshop | null>(null)
  /** why the sign-in could not be asked for, or why it ended without the person asking */
  const problem = shallowRef<ApiProblem | null>(null)
  const knownPeople = ref<KnownPerson[]>(readKept('people', KnownPerson.array()) ?? [])
  const timeZone = computed(() => workshop.value?.timeZone)
  let loading: Promise<void> | null = null

  function signedIn(answer: SignedIn): void {
    // A socket belongs to the sign-in that opened it.
    if (person.value && person.value.id !== answer.person.id) live.disconnect()
    person.value = answer.person
    workshop.value = answer.workshop ?? null
    problem.value = null
    status.value = 'in'
    remember(answer.person)
    live.connect()
  }

  function ended(why: ApiProblem | null): void {
    live.disconnect()
    person.value = null
    problem.value = why
    status.value = 'out'
  }

  function remember({ name, email }: Person): void {
    const others = knownPeople.value.filter((known) => known.email !== email)
    knownPeople.value = [{ name, email }, ...others].slice(0, MAX_KNOWN)
    keep('people', knownPeople.value)
  }

  function forget(email: string): void {
    knownPeople.value = knownPeople.value.filter((known) => known.email !== email)
    keep('people', knownPeople.value)
  }

  http.onSession((event) => {
    if (event.kind === 'signedIn') signedIn(event.signedIn)
    else if (event.kind === 'ended') {
      // Being signed out is the normal state of a fresh page, not news.
      ended(status.value === 'in' ? event.problem : null)
    } else void load()
  })
  live.onSessionEnded((why) => {
    if (status.value === 'in') ended(why)
  })

  /** Asks who is signed in. Never rejects: the state tells. */
  function load(): Promise<void> {
    loading ??= askWho().finally(() => {
      loading = null
    })
    return loading
  }

  async function askWho(): Promise<void> {
    try {
      signedIn(await api('auth.me'))
    } catch (cause) {
      const why = toApiProblem(cause)
      if (why.status === 401) {
        if (status.value !== 'out') ended(null)
      } else problem.value = why
    }
  }

  async function signIn(email: string, password: string): Promise<void> {
    await api('auth.signIn', { body: { email, password } })
  }

  async function signOut(everywhere = false): Promise<void> {
    await api('auth.signOut', { body: { everywhere } })
  }

  function lookAtInvite(token: string, signal?: AbortSignal): Promise<RouteAnswer<'invites.look'>> {
    return api('invites.look', { params: { token } }, { signal })
  }

  async function acceptInvite(token: string, password: string): Promise<void> {
    await api('invites.accept', { body: { token, password } })
  }

  function may(permission: Permission): boolean {
    return person.value?.permissions.includes(permission) ?? false
  }

  return {
    status,
    person,
    workshop,
    timeZone,
    problem,
    knownPeople,
    load,
    signIn,
    signOut,
    lookAtInvite,
    acceptInvite,
    forget,
    may,
  }
})

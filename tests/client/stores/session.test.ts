import { createPinia, setActivePinia } from 'pinia'
import { beforeEach, expect, test, vi } from 'vitest'
import { ApiProblem } from '../../../src/api/apiProblem.ts'
import type { SessionEvent } from '../../../src/api/http.ts'
import type { SignedIn } from '../../../src/shared/contract/auth.ts'
import { ERRORS } from '../../../src/shared/contract/errors.ts'
import { useSessionStore } from '../../../src/stores/session.ts'

const fake = vi.hoisted(() => ({
  api: vi.fn<(key: string, parts?: unknown) => Promise<unknown>>(),
  tell: (_event: unknown): void => undefined,
  endSocket: (_problem: unknown): void => undefined,
  connect: vi.fn(),
  disconnect: vi.fn(),
}))
vi.mock('../../../src/api/http.ts', () => ({
  api: fake.api,
  http: {
    onSession: (listener: (event: unknown) => void) => {
      fake.tell = listener
    },
  },
}))
vi.mock('../../../src/api/socket.ts', () => ({
  live: {
    connect: fake.connect,
    disconnect: fake.disconnect,
    onSessionEnded: (listener: (problem: unknown) => void) => {
      fake.endSocket = listener
    },
  },
}))

function signedInAs(name: string, id: string): SignedIn {
  return {
    person: {
      id,
      name,
      email: `${name}@harrowlane.test`,
      roles: ['installer'],
      permissions: ['runChecks', 'read'],
    },
    tokenUntil: '2026-12-01T07:10:00.000Z',
    sessionId: '708192a3-b4c5-46d7-a8f9-011223344556',
    workshop: { name: 'Harrow Lane Instruments', timeZone: 'Europe/London' },
  }
}
const ONE = signedInAs('one', '3c4d5e6f-7081-4293-a4b5-c6d7e8f90112')
const TWO = signedInAs('two', '4c4d5e6f-7081-4293-a4b5-c6d7e8f90112')
const REQUIRED = new ApiProblem({
  type: '',
  code: 'sign-in.required',
  status: 401,
  ...ERRORS['sign-in.required'],
})
const tell = (event: SessionEvent) => fake.tell(event)

beforeEach(() => {
  localStorage.clear()
  vi.clearAllMocks()
  setActivePinia(createPinia())
})

test('load() takes over who is signed in and opens the live connection', async () => {
  fake.api.mockResolvedValueOnce(ONE)
  const session = useSessionStore()
  await session.load()
  expect(session.status).toBe('in')
  expect(session.person?.name).toBe('one')
  expect(session.timeZone).toBe('Europe/London')
  expect(fake.connect).toHaveBeenCalledOnce()
})

test('load() asks once, however often it is called meanwhile', async () => {
  fake.api.mockResolvedValue(ONE)
  const session = useSessionStore()
  await Promise.all([session.load(), session.load(), session.load()])
  expect(fake.api).toHaveBeenCalledOnce()
})

test('load() knows a person who is not signed in, without calling it a problem', async () => {
  fake.api.mockRejectedValueOnce(REQUIRED)
  const session = useSessionStore()
  await session.load()
  expect(session.status).toBe('out')
  expect(session.problem).toBeNull()
})

test('load() leaves open who is there while the server is out of reach', async () => {
  fake.api.mockRejectedValueOnce(new ApiProblem('client.offline'))
  const session = useSessionStore()
  await session.load()
  expect(session.status).toBe('unknown')
  expect(session.problem?.code).toBe('client.offline')
})

test('may() goes by the permissions that the server gave', () => {
  const session = useSessionStore()
  expect(session.may('runChecks')).toBe(false)
  tell({ kind: 'signedIn', signedIn: ONE })
  expect(session.may('runChecks')).toBe(true)
  expect(session.may('administer')).toBe(false)
})

test('a change of person closes the live connection of the one before', () => {
  const session = useSessionStore()
  tell({ kind: 'signedIn', signedIn: ONE })
  expect(fake.disconnect).not.toHaveBeenCalled()
  tell({ kind: 'signedIn', signedIn: TWO })
  expect(fake.disconnect).toHaveBeenCalledOnce()
  expect(fake.connect).toHaveBeenCalledTimes(2)
  expect(session.person?.name).toBe('two')
})

test('signing out ends the session without a problem', () => {
  const session = useSessionStore()
  tell({ kind: 'signedIn', signedIn: ONE })
  tell({ kind: 'ended', problem: null })
  expect(session.status).toBe('out')
  expect(session.person).toBeNull()
  expect(session.problem).toBeNull()
  expect(fake.disconnect).toHaveBeenCalledOnce()
})

test('a sign-in that was ended by the server says why', () => {
  const session = useSessionStore()
  tell({ kind: 'signedIn', signedIn: ONE })
  fake.endSocket(REQUIRED)
  expect(session.status).toBe('out')
  expect(session.problem?.code).toBe('sign-in.required')
})

test('a change in another tab is looked up again', async () => {
  const session = useSessionStore()
  tell({ kind: 'signedIn', signedIn: ONE })
  fake.api.mockResolvedValueOnce(TWO)
  tell({ kind: 'changedElsewhere' })
  await vi.waitFor(() => expect(session.person?.name).toBe('two'))
})

test('the terminal remembers the last six people, the latest first, and forgets on request', () => {
  const session = useSessionStore()
  const names = ['a', 'b', 'c', 'd', 'e', 'f', 'g', 'b']
  for (const name of names) {
    tell({
      kind: 'signedIn',
      signedIn: signedInAs(name, `${name.charCodeAt(0)}c4d5e6f-7081-4293-a4b5-c6d7e8f90112`),
    })
  }
  expect(session.knownPeople.map((known) => known.name)).toEqual(['b', 'g', 'f', 'e', 'd', 'c'])
  session.forget('g@harrowlane.test')
  setActivePinia(createPinia())
  expect(useSessionStore().knownPeople.map((known) => known.name)).toEqual(['b', 'f', 'e', 'd', 'c'])
})

import { createPinia, setActivePinia } from 'pinia'
import { expect, test, vi } from 'vitest'
import { createMemoryHistory } from 'vue-router'
import { makeRouter } from '../../../src/router/index.ts'
import { useSessionStore } from '../../../src/stores/session.ts'

vi.mock('../../../src/api/http.ts', () => ({ api: vi.fn(), http: { onSession: () => undefined } }))
vi.mock('../../../src/api/socket.ts', () => ({ live: { onSessionEnded: () => undefined } }))
vi.mock('../../../src/views/CheckView.vue', () => ({ default: { render: () => null } }))
vi.mock('../../../src/views/InstrumentView.vue', () => ({ default: { render: () => null } }))

test.each([
  ['/check/hl2401873?run=1', '/check/HL2401873?run=1'],
  ['/instruments/hl2401873', '/instruments/HL2401873'],
  ['/check/HL2401873', '/check/HL2401873'],
  ['/check', '/check'],
])('the address %s leads to %s', async (asked, reached) => {
  setActivePinia(createPinia())
  useSessionStore().status = 'in'
  const router = makeRouter(createMemoryHistory())
  await router.push(asked)
  expect(router.currentRoute.value.fullPath).toBe(reached)
})

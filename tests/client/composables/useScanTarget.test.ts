import { flushPromises, mount } from '@vue/test-utils'
import { createPinia, setActivePinia } from 'pinia'
import { beforeEach, expect, test, vi } from 'vitest'
import { createMemoryHistory, createRouter } from 'vue-router'
import { cleanCode, useScanTarget } from '../../../src/composables/useScanTarget.ts'
import { ApiProblem } from '../../../src/api/apiProblem.ts'
import type { Permission } from '../../../src/shared/contract/permissions.ts'
import type { ScanTarget } from '../../../src/shared/contract/workshop.ts'
import { useSessionStore } from '../../../src/stores/session.ts'
import { useWorkshopStore } from '../../../src/stores/workshop.ts'

const fake = vi.hoisted(() => ({ api: vi.fn<(key: string, parts?: unknown) => Promise<unknown>>() }))
vi.mock('../../../src/api/http.ts', () => ({ api: fake.api, http: { onSession: () => undefined } }))
vi.mock('../../../src/api/socket.ts', () => ({ live: { onSessionEnded: () => undefined } }))

const RUN = '0f6a1d2e-3b4c-4d5e-8f60-718293a4b5c6'
const BENCH = '2b3c4d5e-6f70-4182-93a4-b5c6d7e8f901'

async function at(start: string, permissions: Permission[]) {
  setActivePinia(createPinia())
  const empty = { render: () => null }
  const router = createRouter({
    history: createMemoryHistory(),
    routes: [
      { path: '/check/:serial?', name: 'check', component: empty },
      { path: '/instruments', name: 'instruments', component: empty },
      { path: '/instruments/:serial', name: 'instrument', component: empty },
      { path: '/runs/:id', name: 'run', component: empty },
    ],
  })
  await router.push(start)
  let scan!: ReturnType<typeof useScanTarget>
  mount({ setup: () => ((scan = useScanTarget()), () => null) }, { global: { plugins: [router] } })
  useSessionStore().person = { id: RUN, name: 'p', email: 'p@harrowlane.test', roles: [], permissions }
  const open = async (text: string, target: ScanTarget | ApiProblem) => {
    if (target instanceof ApiProblem) fake.api.mockRejectedValueOnce(target)
    else fake.api.mockResolvedValueOnce(target)
    await scan.open(text)
    await flushPromises()
    return router.currentRoute.value.fullPath
  }
  return { scan, open }
}
const INSTALLER: Permission[] = ['runChecks', 'read']

beforeEach(() => {
  localStorage.clear()
  fake.api.mockReset()
})

test('open() takes a known serial to its check at the bench', async () => {
  const { open } = await at('/check', INSTALLER)
  const path = await open('hl2401873', {
    kind: 'instrument',
    serial: 'HL2401873',
    modelName: 'Linden concert',
  })
  expect(path).toBe('/check/HL2401873')
  expect(fake.api).toHaveBeenCalledWith('scan.resolve', { params: { code: 'HL2401873' } })
})

test('open() goes on looking things up where things are being looked up', async () => {
  const { open } = await at('/instruments', INSTALLER)
  expect(await open('HL2401873', { kind: 'instrument', serial: 'HL2401873', modelName: 'm' })).toBe(
    '/instruments/HL2401873',
  )
})

test('open() shows the instrument to whoever may not run checks', async () => {
  const { open } = await at('/runs/x', ['read'])
  expect(await open('HL2401873', { kind: 'instrument', serial: 'HL2401873', modelName: 'm' })).toBe(
    '/instruments/HL2401873',
  )
})

test('open() takes an unknown serial to Check, to be made up with a model', async () => {
  const { open } = await at('/instruments', INSTALLER)
  expect(await open('HL2499999', { kind: 'unknownSerial', serial: 'HL2499999' })).toBe('/check/HL2499999')
})

test('open() tells an unknown serial to whoever may not start it', async () => {
  const { open, scan } = await at('/instruments', ['read'])
  expect(await open('HL2499999', { kind: 'unknownSerial', serial: 'HL2499999' })).toBe('/instruments')
  expect(scan.done.value).toBe('No instrument has the serial HL2499999.')
})

test('open() goes to a run', async () => {
  const { open } = await at('/check', INSTALLER)
  expect(await open(RUN, { kind: 'run', runId: RUN })).toBe(`/runs/${RUN}`)
})

test('open() puts the terminal at a scanned bench and stays on the page', async () => {
  const { open, scan } = await at('/check', INSTALLER)
  expect(await open('BENCH1', { kind: 'bench', benchId: BENCH, name: 'Window' })).toBe('/check')
  expect(useWorkshopStore().benchId).toBe(BENCH)
  expect(scan.done.value).toContain('Window')
})

test('open() keeps the problem and the page', async () => {
  const { open, scan } = await at('/check', INSTALLER)
  expect(await open('HL2401873', new ApiProblem('client.offline'))).toBe('/check')
  expect(scan.problem.value?.code).toBe('client.offline')
  expect(scan.resolving.value).toBe(false)
})

test('open() drops the answer to an older scan', async () => {
  const { open, scan } = await at('/check', INSTALLER)
  let answerOld!: (target: ScanTarget) => void
  fake.api.mockReturnValueOnce(new Promise((resolve) => (answerOld = resolve)))
  const old = scan.open('HL0001')
  expect(await open('HL0002', { kind: 'unknownSerial', serial: 'HL0002' })).toBe('/check/HL0002')
  answerOld({ kind: 'unknownSerial', serial: 'HL0001' })
  await old
  expect(useWorkshopStore().benchId).toBeNull()
  expect(await open('HL0003', { kind: 'unknownSerial', serial: 'HL0003' })).toBe('/check/HL0003')
})

test('cleanCode() writes a serial in capitals and takes the end of an address', () => {
  expect(cleanCode(' hl2401873 ')).toBe('HL2401873')
  expect(cleanCode(`https://evenstrung.harrowlane.test/runs/${RUN}?x=1`)).toBe(RUN)
  expect(cleanCode(RUN)).toBe(RUN)
})

import { enableAutoUnmount, flushPromises, mount } from '@vue/test-utils'
import { createPinia, setActivePinia } from 'pinia'
import { afterEach, beforeEach, expect, test, vi } from 'vitest'
import { nextTick } from 'vue'
import { createMemoryHistory, createRouter } from 'vue-router'
import TopStrip from '../../../../src/components/common/TopStrip.vue'
import { ApiProblem } from '../../../../src/api/apiProblem.ts'
import type { LiveState } from '../../../../src/api/socket.ts'
import type { Role } from '../../../../src/shared/contract/permissions.ts'
import { permissionsOf } from '../../../../src/shared/contract/permissions.ts'
import type { BenchView } from '../../../../src/shared/contract/workshop.ts'
import { useSessionStore } from '../../../../src/stores/session.ts'

const fake = vi.hoisted(() => ({
  api: vi.fn<(key: string, parts?: unknown) => Promise<unknown>>(),
  state: { value: 'connected' },
  benches: (_benches: unknown): void => undefined,
}))
vi.mock('../../../../src/api/http.ts', () => ({ api: fake.api, http: { onSession: () => undefined } }))
vi.mock('../../../../src/api/socket.ts', async () => {
  const { ref } = await import('vue')
  fake.state = ref('connected')
  return {
    live: {
      state: fake.state,
      onSessionEnded: () => undefined,
      watchBenches: (handlers: { onBenches: (benches: unknown) => void }) => {
        fake.benches = handlers.onBenches
        return () => undefined
      },
    },
  }
})

const BENCH: BenchView = {
  id: '2b3c4d5e-6f70-4182-93a4-b5c6d7e8f901',
  name: 'Window',
  code: 'BENCH1',
  enrolled: true,
  simulated: true,
  channelKind: 'six',
  capabilities: [],
  connected: true,
  verifiedAt: '2026-12-01T07:12:00.000Z',
  verifiedUntil: '2026-12-02T07:12:00.000Z',
  verified: true,
  openRun: null,
}
const setState = (state: LiveState) => {
  fake.state.value = state
  return nextTick()
}

async function strip(roles: Role[] = ['installer']) {
  setActivePinia(createPinia())
  const empty = { render: () => null }
  const router = createRouter({
    history: createMemoryHistory(),
    routes: [
      { path: '/', component: empty },
      {
        path: '/check/:serial?',
        name: 'check',
        component: empty,
        meta: { title: 'Check', section: 'check' },
      },
      {
        path: '/instruments',
        name: 'instruments',
        component: empty,
        meta: { title: 'Instruments', section: 'instruments' },
      },
    ],
  })
  await router.push('/check')
  useSessionStore().$patch({
    status: 'in',
    person: {
      id: '3c4d5e6f-7081-4293-a4b5-c6d7e8f90112',
      name: 'Bench hand',
      email: 'installer@harrowlane.test',
      roles,
      permissions: permissionsOf(roles),
    },
  })
  const shown = mount(TopStrip, { global: { plugins: [router] }, attachTo: document.body })
  fake.benches([
    BENCH,
    { ...BENCH, id: '3b3c4d5e-6f70-4182-93a4-b5c6d7e8f901', name: 'Door', simulated: false, verified: false },
  ])
  await flushPromises()
  return { shown, router }
}

enableAutoUnmount(afterEach)
beforeEach(() => {
  localStorage.setItem('evenstrung.bench', JSON.stringify(BENCH.id))
  fake.state.value = 'connected'
  vi.useFakeTimers({ toFake: ['Date'], now: Date.parse('2026-12-01T12:00:00.000Z') })
})
afterEach(() => {
  vi.useRealTimers()
  localStorage.clear()
  document.body.replaceChildren()
})

const benchText = (shown: Awaited<ReturnType<typeof strip>>['shown']) =>
  shown.get('.place:not(.place--person)').text().replace(/\s+/g, ' ')

test('the strip names the bench of this terminal, marks a simulated one and says since when it is verified', async () => {
  const { shown } = await strip()
  expect(benchText(shown)).toMatch(/^Bench Window ?simulated ?verified \d\d:12$/)
})

test('the strip asks for the bench when this terminal has none', async () => {
  localStorage.clear()
  const { shown } = await strip()
  expect(benchText(shown)).toBe('Choose the bench')
})

test('the strip lets the bench be chosen and remembers it', async () => {
  const { shown } = await strip()
  await shown.get('.place:not(.place--person)').trigger('click')
  const [door] = shown.findAll('#strip-panel li button')
  expect(door!.text()).toContain('not verified')
  await door!.trigger('click')
  expect(benchText(shown)).toMatch(/^Bench Door ?not verified$/)
  expect(JSON.parse(localStorage.getItem('evenstrung.bench')!)).toBe('3b3c4d5e-6f70-4182-93a4-b5c6d7e8f901')
  expect(shown.get('#strip-panel').attributes('hidden')).toBeDefined()
})

test('the strip says that the connection is lost, and stops saying it when it is back', async () => {
  const { shown } = await strip()
  await setState('reconnecting')
  expect(benchText(shown)).toContain('connection lost, trying again')
  expect(benchText(shown)).not.toContain('verified')
  expect(shown.get('[role="status"]').text()).toBe('connection lost, trying again')
  await setState('connected')
  expect(benchText(shown)).toContain('verified')
  expect(shown.get('[role="status"]').text()).toBe('')
})

test('the strip shows only the sections that the role opens', async () => {
  const words = async (roles: Role[]) =>
    (await strip(roles)).shown.findAll('.sections a').map((link) => link.text())
  expect(await words(['installer'])).toEqual(['Check', 'Instruments'])
  expect(await words(['returnsDesk'])).toEqual(['Instruments'])
})

test('F2 puts the cursor into the scan field', async () => {
  const { shown } = await strip()
  window.dispatchEvent(new KeyboardEvent('keydown', { key: 'F2' }))
  expect(document.activeElement).toBe(shown.get('#scan').element)
})

test('F4 opens the change of person at its first field; Escape closes it and gives the focus back', async () => {
  const { shown } = await strip()
  window.dispatchEvent(new KeyboardEvent('keydown', { key: 'F4' }))
  await flushPromises()
  expect(document.activeElement?.id).toBe('email')
  await shown.get('#email').trigger('keydown', { key: 'Escape' })
  expect(shown.get('#strip-panel').attributes('hidden')).toBeDefined()
  expect(document.activeElement).toBe(shown.get('.place--person').element)
})

test('a typed serial is opened with Enter and the field gives the keys back', async () => {
  const { shown, router } = await strip()
  fake.api.mockResolvedValueOnce({ kind: 'unknownSerial', serial: 'HL2499999' })
  const field = shown.get<HTMLInputElement>('#scan')
  field.element.focus()
  await field.setValue('hl2499999')
  await shown.get('form').trigger('submit')
  await flushPromises()
  expect(router.currentRoute.value.fullPath).toBe('/check/HL2499999')
  expect(document.activeElement).not.toBe(field.element)
})

test('the Escape that closes a panel does not reach the bench, wherever the focus is', async () => {
  const { shown } = await strip()
  const heard = vi.fn()
  window.addEventListener('keydown', heard)
  await shown.get('.place--person').trigger('click')
  ;(document.activeElement as HTMLElement).blur()
  document.body.dispatchEvent(new KeyboardEvent('keydown', { key: 'Escape', bubbles: true }))
  await nextTick()
  expect(shown.get('#strip-panel').attributes('hidden')).toBeDefined()
  expect(heard).not.toHaveBeenCalled()
  document.body.dispatchEvent(new KeyboardEvent('keydown', { key: 'Escape', bubbles: true }))
  expect(heard).toHaveBeenCalledOnce()
  window.removeEventListener('keydown', heard)
})

test('a touch inside a panel leaves it open, one outside closes it', async () => {
  const { shown } = await strip()
  await shown.get('.place--person').trigger('click')
  const isOpen = () => shown.get('#strip-panel').attributes('hidden') === undefined
  await shown.get('#email').trigger('pointerdown')
  expect(isOpen()).toBe(true)
  document.body.dispatchEvent(new Event('pointerdown', { bubbles: true }))
  await nextTick()
  expect(isOpen()).toBe(false)
})

test('a panel closes when the focus goes on to the page', async () => {
  const { shown } = await strip()
  await shown.get('.place--person').trigger('click')
  shown.get<HTMLElement>('.sections a').element.focus()
  await nextTick()
  expect(shown.get('#strip-panel').attributes('hidden')).toBeDefined()
  expect(document.activeElement).toBe(shown.get('.sections a').element)
})

test('the choice of benches says what each of them listens to', async () => {
  const { shown } = await strip()
  fake.benches([
    BENCH,
    { ...BENCH, id: '3b3c4d5e-6f70-4182-93a4-b5c6d7e8f901', name: 'Door', channelKind: 'one' },
  ])
  await shown.get('.place:not(.place--person)').trigger('click')
  const [door, window] = shown.findAll('#strip-panel li button').map((button) => button.text())
  expect(door).toContain('jack only')
  expect(window).toContain('six channels')
})

test('the page that waits for a scan has the cursor in the scan field, also after the bench was chosen', async () => {
  const { shown } = await strip()
  const field = shown.get('#scan').element
  expect(document.activeElement).toBe(field)
  await shown.get('.place:not(.place--person)').trigger('click')
  await flushPromises()
  expect(document.activeElement).toBe(shown.find('#strip-panel li button').element)
  await shown.findAll('#strip-panel li button')[0]!.trigger('click')
  expect(document.activeElement).toBe(field)
})

test('typing on the page that waits for a scan goes into the scan field, at a check it does not', async () => {
  const { shown, router } = await strip()
  const field = shown.get<HTMLInputElement>('#scan').element
  const type = () => document.body.dispatchEvent(new KeyboardEvent('keydown', { key: 'h', bubbles: true }))
  field.blur()
  type()
  expect(document.activeElement).toBe(field)
  await router.push('/check/HL2401873')
  field.blur()
  type()
  expect(document.activeElement).not.toBe(field)
})

test('the scan field shows the serial of the check, and nothing once it was left', async () => {
  const { shown, router } = await strip()
  const field = shown.get<HTMLInputElement>('#scan').element
  await router.push('/check/HL2401873?run=1')
  await nextTick()
  expect(field.value).toBe('HL2401873')
  await router.push('/instruments')
  await nextTick()
  expect(field.value).toBe('')
})

test('a scan that was refused leaves the serial on the bench in the field', async () => {
  const { shown, router } = await strip()
  await router.push('/check/HL2401873?run=1')
  router.beforeEach((to) => to.params.serial !== 'HL2499999')
  fake.api.mockResolvedValueOnce({ kind: 'unknownSerial', serial: 'HL2499999' })
  const field = shown.get<HTMLInputElement>('#scan')
  await field.setValue('HL2499999')
  await shown.get('form').trigger('submit')
  await flushPromises()
  expect(router.currentRoute.value.params.serial).toBe('HL2401873')
  expect(field.element.value).toBe('HL2401873')
})

test('a code that could not be looked up stays to be corrected until the page changes', async () => {
  const { shown, router } = await strip()
  fake.api.mockRejectedValueOnce(new ApiProblem('client.offline'))
  const field = shown.get<HTMLInputElement>('#scan')
  await field.setValue('HL24O')
  await shown.get('form').trigger('submit')
  await flushPromises()
  expect(field.element.value).toBe('HL24O')
  field.element.blur()
  await router.push('/instruments')
  await flushPromises()
  expect(field.element.value).toBe('')
})

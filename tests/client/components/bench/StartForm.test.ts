import { enableAutoUnmount, flushPromises, mount } from '@vue/test-utils'
import { createPinia, setActivePinia } from 'pinia'
import { afterEach, beforeEach, expect, test, vi } from 'vitest'
import { createMemoryHistory, createRouter } from 'vue-router'
import StartForm from '../../../../src/components/bench/StartForm.vue'
import { permissionsOf } from '../../../../src/shared/contract/permissions.ts'
import type { RunSummary } from '../../../../src/shared/contract/runs.ts'
import type { BenchView } from '../../../../src/shared/contract/workshop.ts'
import { useCheckStore } from '../../../../src/stores/check.ts'
import { useSessionStore } from '../../../../src/stores/session.ts'
import { useWorkshopStore } from '../../../../src/stores/workshop.ts'
import { IDS, aModel } from '../../../fixtures/runParts.ts'

vi.mock('../../../../src/api/http.ts', () => ({ api: vi.fn(), http: { onSession: () => undefined } }))
vi.mock('../../../../src/api/socket.ts', () => ({ live: { onSessionEnded: () => undefined } }))

const BENCH: BenchView = {
  id: IDS.bench,
  name: 'Window',
  code: 'HLBENCH1',
  enrolled: true,
  simulated: false,
  channelKind: 'six',
  capabilities: [],
  connected: true,
  verifiedAt: null,
  verifiedUntil: null,
  verified: true,
  openRun: null,
}
const RUN: RunSummary = {
  id: IDS.run,
  serial: 'HL2401873',
  modelName: 'Linden concert',
  benchName: 'Window',
  person: 'Bench hand',
  reason: 'new',
  status: 'open',
  verdict: null,
  openedAt: '2026-12-01T09:00:00.000Z',
  endedAt: null,
  sheetLabel: 'LC-7',
  handedness: 'right',
  balancesDb: [null, null, null, null, null, null],
  balanceLowDb: null,
  balanceHighDb: null,
  failing: [],
}

async function form(run: Partial<RunSummary>) {
  setActivePinia(createPinia())
  const empty = { render: () => null }
  const router = createRouter({
    history: createMemoryHistory(),
    routes: [{ path: '/check/:serial?', name: 'check', component: empty }],
  })
  await router.push('/check/HL2401873')
  useSessionStore().person = {
    id: IDS.person,
    name: 'Bench hand',
    email: 'installer@harrowlane.test',
    roles: ['installer'],
    permissions: permissionsOf(['installer']),
  }
  const workshop = useWorkshopStore()
  workshop.benches = [BENCH]
  workshop.chooseBench(IDS.bench)
  useCheckStore().$patch({
    serial: 'HL2401873',
    phase: 'ready',
    instrument: {
      instrument: {
        id: IDS.instrument,
        serial: 'HL2401873',
        modelId: IDS.model,
        modelName: 'Linden concert',
        createdAt: '2026-11-30T09:00:00.000Z',
        runs: 1,
        lastRunAt: RUN.openedAt,
        lastVerdict: null,
      },
      model: aModel(),
      runs: [{ ...RUN, ...run }],
    },
  })
  const shown = mount(StartForm, { global: { plugins: [router] }, attachTo: document.body })
  await flushPromises()
  return { shown, router }
}

enableAutoUnmount(afterEach)
beforeEach(() => localStorage.clear())

test('a serial that is being checked is told before the form, with the way to its run', async () => {
  const { shown, router } = await form({})
  const note = shown.get('.open')
  expect(note.text()).toContain('at this bench, by you')
  const way = shown.get('#start-open-run')
  expect(way.text()).toBe('Go on with that run')
  expect(document.activeElement).toBe(way.element)
  await way.trigger('click')
  await flushPromises()
  expect(router.currentRoute.value.fullPath).toBe(`/check/HL2401873?run=${IDS.run}`)
})

test('the run of someone else at another bench is named as such', async () => {
  const { shown } = await form({ benchName: 'Door', person: 'Second hand' })
  expect(shown.get('.open').text()).toContain('at bench Door, by Second hand')
  expect(shown.get('#start-open-run').text()).toBe('Watch that run')
})

test('a serial whose last run has ended has nothing before its form', async () => {
  const { shown } = await form({ status: 'sealed', verdict: 'pass' })
  expect(shown.find('.open').exists()).toBe(false)
  expect(document.activeElement?.id).toBe('start-controls')
})

import { enableAutoUnmount, flushPromises, mount } from '@vue/test-utils'
import { createPinia, setActivePinia } from 'pinia'
import { afterEach, beforeEach, expect, test, vi } from 'vitest'
import SimulatedBench from '../../../../src/components/bench/SimulatedBench.vue'
import { ApiProblem } from '../../../../src/api/apiProblem.ts'
import type { BenchView } from '../../../../src/shared/contract/workshop.ts'
import { useLiveStore } from '../../../../src/stores/live.ts'
import { useWorkshopStore } from '../../../../src/stores/workshop.ts'
import { IDS } from '../../../fixtures/runParts.ts'
import { leftHanded, liveAt } from '../../../fixtures/runViews.ts'

const fake = vi.hoisted(() => ({ api: vi.fn<(key: string, parts?: unknown) => Promise<unknown>>() }))
vi.mock('../../../../src/api/http.ts', () => ({ api: fake.api, http: { onSession: () => undefined } }))
vi.mock('../../../../src/api/socket.ts', async () => {
  const { ref, shallowRef } = await import('vue')
  return { live: { state: ref('connected'), lostAt: shallowRef(null), onSessionEnded: () => undefined } }
})

const BENCH: BenchView = {
  id: IDS.bench,
  name: 'Window',
  code: 'HLBENCH1',
  enrolled: true,
  simulated: true,
  channelKind: 'six',
  capabilities: [],
  connected: true,
  verifiedAt: null,
  verifiedUntil: null,
  verified: true,
  openRun: null,
}

/** As after the page was loaded: the stores are new, what the tab keeps is not. */
function load(connected = true) {
  setActivePinia(createPinia())
  useWorkshopStore().benches = [{ ...BENCH, connected }]
  return mount(SimulatedBench, { props: { benchId: IDS.bench } })
}
type Shown = ReturnType<typeof load>
const hand = (shown: Shown) => shown.get('[aria-label="Automatic hand"]')
const pressed = (shown: Shown) =>
  hand(shown)
    .findAll('[aria-pressed]')
    .map((button) => button.attributes('aria-pressed'))
const press = async (shown: Shown, no: number) => {
  await hand(shown).findAll('[aria-pressed]')[no]!.trigger('click')
  await flushPromises()
}

enableAutoUnmount(afterEach)
beforeEach(() => {
  sessionStorage.clear()
  localStorage.clear()
  fake.api.mockReset()
  fake.api.mockResolvedValue({})
})

test('the hand is shown as not known until it was set from here', async () => {
  const shown = load()
  expect(pressed(shown)).toEqual(['false', 'false'])
  expect(hand(shown).text()).toContain('On or off?')
  await press(shown, 1)
  expect(fake.api).toHaveBeenCalledWith('benches.simulate', {
    params: { id: IDS.bench },
    body: { kind: 'automaticHand', on: false, speed: 1 },
  })
  expect(pressed(shown)).toEqual(['false', 'true'])
  expect(hand(shown).text()).not.toContain('On or off?')
})

test('the hand that was set on is shown as on after the page is loaded again', async () => {
  await press(load(), 0)
  expect(pressed(load())).toEqual(['true', 'false'])
})

test('a command that was refused leaves the hand as it was known', async () => {
  const shown = load()
  fake.api.mockRejectedValueOnce(new ApiProblem('client.offline'))
  await press(shown, 0)
  expect(pressed(shown)).toEqual(['false', 'false'])
})

test('nothing is known of the hand of a bench that was away', async () => {
  const shown = load()
  await press(shown, 0)
  useWorkshopStore().benches = [{ ...BENCH, connected: false }]
  await flushPromises()
  useWorkshopStore().benches = [BENCH]
  await flushPromises()
  expect(pressed(shown)).toEqual(['false', 'false'])
  expect(hand(shown).text()).toContain('On or off?')
})

test('the strings to pluck lie as on the model: bass first, on a left-handed one treble first', async () => {
  const shown = load()
  const order = () =>
    shown
      .get('[aria-label="Pluck a string"]')
      .findAll('[aria-label]')
      .map((button) => button.text())
  useLiveStore().run = liveAt('strings')
  await flushPromises()
  expect(order()).toEqual(['6', '5', '4', '3', '2', '1'])
  useLiveStore().run = leftHanded()
  await flushPromises()
  expect(order()).toEqual(['1', '2', '3', '4', '5', '6'])
})

import { flushPromises, mount, type VueWrapper } from '@vue/test-utils'
import { createPinia, setActivePinia } from 'pinia'
import { afterEach, beforeEach, describe, expect, test, vi } from 'vitest'
import { createMemoryHistory, createRouter, type Router } from 'vue-router'
import { ApiProblem } from '../../../src/api/apiProblem.ts'
import type { RunHandlers } from '../../../src/api/socket.ts'
import type { Person } from '../../../src/shared/contract/auth.ts'
import { ERRORS, type ErrorCode } from '../../../src/shared/contract/errors.ts'
import { permissionsOf, type Role } from '../../../src/shared/contract/permissions.ts'
import type { RunStart, RunView } from '../../../src/shared/contract/runs.ts'
import type { BenchView, ModelView } from '../../../src/shared/contract/workshop.ts'
import { useSessionStore } from '../../../src/stores/session.ts'
import { useWorkshopStore } from '../../../src/stores/workshop.ts'
import CheckView from '../../../src/views/CheckView.vue'
import { IDS, aModel, aSetup, aSheet } from '../../fixtures/runParts.ts'
import { liveAt, sealedFail, sealedPass, stoppedRun } from '../../fixtures/runViews.ts'

interface Outside {
  answers: Record<string, () => unknown>
  calls: { key: string; parts: { body?: unknown } }[]
  handlers: unknown
}
const outside = vi.hoisted((): Outside => ({ answers: {}, calls: [], handlers: null }))
vi.mock('../../../src/api/http.ts', () => ({
  api: (key: string, parts: { body?: unknown } = {}) => {
    outside.calls.push({ key, parts })
    return Promise.resolve().then(() => outside.answers[key]!())
  },
  http: { onSession: () => () => undefined },
}))
vi.mock('../../../src/api/socket.ts', async () => {
  const { ref, shallowRef } = await import('vue')
  return {
    live: {
      state: ref('connected'),
      lostAt: shallowRef(null),
      connect: () => undefined,
      disconnect: () => undefined,
      onSessionEnded: () => () => undefined,
      watchBenches: () => () => undefined,
      watchRun: (_run: string, handlers: unknown) => {
        outside.handlers = handlers
        return () => undefined
      },
    },
  }
})
// The page of a test has no canvas.
vi.mock('../../../src/components/charts/LevelStripChart.vue', () => ({ default: { template: '<div />' } }))

const bench: BenchView = {
  id: IDS.bench,
  name: 'Window',
  code: 'HLBENCH1',
  enrolled: true,
  simulated: false,
  channelKind: 'six',
  capabilities: aSetup().capabilities,
  connected: true,
  verifiedAt: null,
  verifiedUntil: null,
  verified: true,
  openRun: null,
}
const model: ModelView = {
  ...aModel(),
  sheetInForce: { id: IDS.sheet, label: 'LC-7', revision: 7, status: 'inForce', inForceFrom: null },
  sheet: aSheet(),
}
const instrument = {
  instrument: {
    id: IDS.instrument,
    serial: 'HL2401873',
    modelId: IDS.model,
    modelName: 'Linden concert',
    createdAt: '2026-11-30T09:00:00.000Z',
    runs: 0,
    lastRunAt: null,
    lastVerdict: null,
  },
  model: aModel(),
  runs: [],
}
const refuse =
  (code: ErrorCode, facts: Record<string, string> = {}) =>
  () => {
    throw new ApiProblem({ type: '', code, status: 409, ...ERRORS[code], facts })
  }
const person = (roles: Role[]): Person => ({
  id: IDS.person,
  name: 'Bench hand',
  email: 'installer@harrowlane.test',
  roles,
  permissions: permissionsOf(roles),
})

let wrapper: VueWrapper | null = null
let router: Router

async function open(
  path: string,
  options: { roles?: Role[]; bench?: Partial<BenchView> } = {},
): Promise<VueWrapper> {
  const session = useSessionStore()
  session.status = 'in'
  session.person = person(options.roles ?? ['installer'])
  const workshop = useWorkshopStore()
  workshop.benches = [{ ...bench, ...options.bench }]
  workshop.benchesKnown = true
  workshop.chooseBench(IDS.bench)
  const empty = { template: '<div />' }
  router = createRouter({
    history: createMemoryHistory(),
    routes: [
      { path: '/check/:serial?', name: 'check', component: CheckView },
      { path: '/runs/:id', name: 'run', component: empty },
    ],
  })
  await router.push(path)
  wrapper = mount({ template: '<RouterView />' }, { global: { plugins: [router] }, attachTo: document.body })
  await flushPromises()
  return wrapper
}
async function come(view: RunView): Promise<void> {
  ;(outside.handlers as RunHandlers).onView(view)
  await flushPromises()
}
const started = () =>
  outside.calls.filter((call) => call.key === 'runs.start').map((call) => call.parts.body as RunStart)
const controls = () => wrapper!.get<HTMLInputElement>('#start-controls')

beforeEach(() => {
  setActivePinia(createPinia())
  localStorage.clear()
  outside.calls.length = 0
  outside.handlers = null
  outside.answers = {
    'scan.resolve': () => ({ kind: 'instrument', serial: 'HL2401873', modelName: 'Linden concert' }),
    'instruments.read': () => instrument,
    'models.list': () => ({ items: [model] }),
    'benches.list': () => ({ items: [bench] }),
    'cautions.read': () => ({ acknowledged: true, shift: 'early', acknowledgedAt: null }),
    'cautions.acknowledge': () => ({ acknowledged: true, shift: 'early', acknowledgedAt: null }),
    'runs.start': () => liveAt('unplugged'),
    'runs.takeOver': () => liveAt('strings'),
    'runs.act': () => liveAt('strings'),
  }
})
afterEach(() => {
  wrapper?.unmount()
  wrapper = null
  document.body.innerHTML = ''
})

describe('CheckView before a run', () => {
  test('asks for a serial when there is none, and offers the run that is open here', async () => {
    await open('/check', { bench: { openRun: { id: IDS.run, serial: 'HL2401873', person: 'Bench hand' } } })
    expect(wrapper!.get('h1').text()).toBe('Scan a serial')
    expect(wrapper!.text()).toContain('is being checked at this bench by you')
  })

  test('starts with the conditions, once the controls are ticked', async () => {
    await open('/check/HL2401873')
    await wrapper!.get('form.start').trigger('submit')
    expect(started()).toEqual([])
    expect(wrapper!.get('#start-missing').text()).toBe('Set the controls, then tick it.')
    expect(document.activeElement!.id).toBe('start-controls')
    await controls().setValue(true)
    await wrapper!.get('#start-humidity').setValue('46,5')
    await wrapper!.get('form.start').trigger('submit')
    await flushPromises()
    expect(started()[0]).toMatchObject({
      serial: 'HL2401873',
      modelId: null,
      benchId: IDS.bench,
      reason: 'new',
      conditions: { controlsSet: true, humidityPercent: 46.5, excitation: 'hand', mute: 'felt' },
    })
    expect(router.currentRoute.value.query.run).toBe(IDS.run)
    expect(wrapper!.get('h1').text()).toBe('Leave it unplugged')
  })

  test('starts at Enter from anywhere, but not at the Enter of a slow scanner', async () => {
    await open('/check/HL2401873')
    await controls().setValue(true)
    let now = 5000
    const stamp = vi.spyOn(Event.prototype, 'timeStamp', 'get').mockImplementation(() => now)
    const press = (key: string) =>
      document.body.dispatchEvent(new KeyboardEvent('keydown', { key, bubbles: true, cancelable: true }))
    for (const character of 'HL24') {
      press(character)
      now += 70
    }
    press('Enter')
    await flushPromises()
    expect(started()).toEqual([])
    now += 1000
    press('Enter')
    await flushPromises()
    expect(started()).toHaveLength(1)
    stamp.mockRestore()
  })

  test('asks for the model of a new serial only', async () => {
    await open('/check/HL2401873')
    expect(wrapper!.find('#start-model').exists()).toBe(false)
    wrapper!.unmount()
    outside.answers['scan.resolve'] = () => ({ kind: 'unknownSerial', serial: 'HL2402001' })
    await open('/check/HL2402001')
    expect(wrapper!.find('#start-model').exists()).toBe(true)
    await controls().setValue(true)
    await wrapper!.get('form.start').trigger('submit')
    expect(wrapper!.get('#start-missing').text()).toBe('Choose the model.')
  })

  test('remembers string set, climate and hand, never what must be confirmed anew', async () => {
    await open('/check/HL2401873')
    await controls().setValue(true)
    await wrapper!.get('#start-strings').setValue('Light 12-53')
    await wrapper!.get('#start-strung').setValue('35')
    await wrapper!.get('#start-temperature').setValue('21')
    await wrapper!.get('form.start').trigger('submit')
    await flushPromises()
    wrapper!.unmount()
    await open('/check/HL2401873')
    expect(wrapper!.get<HTMLInputElement>('#start-strings').element.value).toBe('Light 12-53')
    expect(wrapper!.get<HTMLInputElement>('#start-temperature').element.value).toBe('21')
    expect(wrapper!.get<HTMLInputElement>('#start-strung').element.value).toBe('')
    expect(controls().element.checked).toBe(false)
  })

  test('tries a start again with the same id, so that one run is opened', async () => {
    outside.answers['runs.start'] = () => {
      throw new ApiProblem('client.offline')
    }
    await open('/check/HL2401873')
    await controls().setValue(true)
    await wrapper!.get('form.start').trigger('submit')
    await flushPromises()
    expect(wrapper!.text()).toContain('The server does not answer.')
    outside.answers['runs.start'] = () => liveAt('unplugged')
    await wrapper!.get('form.start').trigger('submit')
    await flushPromises()
    const [first, second] = started()
    expect(first!.id).toBe(second!.id)
    expect(wrapper!.get('h1').text()).toBe('Leave it unplugged')
  })

  test('shows the cautions before the first run of a shift', async () => {
    outside.answers['cautions.read'] = () => ({ acknowledged: false, shift: 'early', acknowledgedAt: null })
    await open('/check/HL2401873')
    expect(wrapper!.get('h1').text()).toBe('Cautions')
    for (const word of [
      'Phantom power off',
      'Battery polarity',
      'Eye protection',
      '1 megohm',
      'local codes',
    ]) {
      expect(wrapper!.text()).toContain(word)
    }
    await wrapper!
      .findAll('button')
      .find((button) => button.text() === 'I have read them')!
      .trigger('click')
    await flushPromises()
    expect(wrapper!.find('form.start').exists()).toBe(true)
  })
})

describe('CheckView when someone was first', () => {
  const facts = { runId: IDS.run, serial: 'HL2401866', person: 'Second hand', bench: 'Window' }
  async function refused(roles: Role[]): Promise<string> {
    outside.answers['runs.start'] = refuse('bench.busy', facts)
    await open('/check/HL2401873', { roles })
    await controls().setValue(true)
    await wrapper!.get('form.start').trigger('submit')
    await flushPromises()
    return wrapper!.get('.conflict').text()
  }

  test('says who and where, and lets anyone watch', async () => {
    const text = await refused(['installer'])
    expect(text).toContain('HL2401866 at bench Window, opened by Second hand')
    expect(text).toContain('Watch that run')
    expect(text).not.toContain('Take it over')
  })

  test('lets a lead take it over with a reason', async () => {
    expect(await refused(['lead'])).toContain('Take it over')
    await wrapper!
      .findAll('button')
      .find((button) => button.text() === 'Take it over')!
      .trigger('click')
    await wrapper!.get('#take-over-reason').setValue('shift change')
    await wrapper!.get('.conflict form').trigger('submit')
    await flushPromises()
    const call = outside.calls.find((one) => one.key === 'runs.takeOver')!
    expect(call.parts.body).toMatchObject({ reason: 'shift change' })
    expect(wrapper!.get('h1').text()).toBe('Damp, then pluck string 4, D')
  })
})

describe('CheckView during and after a run', () => {
  const path = `/check/HL2401873?run=${IDS.run}`

  test('joins the run of its address', async () => {
    await open(path)
    await come(liveAt('noise'))
    expect(wrapper!.get('h1').text()).toBe('Keep them muted')
  })

  test('keeps the run when another serial is scanned, and says so', async () => {
    await open(path)
    await come(liveAt('strings'))
    await router.push('/check/HL2409999')
    await flushPromises()
    expect(router.currentRoute.value.fullPath).toBe(path)
    expect(wrapper!.get('.notice').text()).toContain('HL2401873 is still on the bench.')
    expect(wrapper!.get('.notice').text()).toContain('HL2409999')
    expect(wrapper!.get('h1').text()).toBe('Damp, then pluck string 4, D')
  })

  test('ends in one verdict with reasons and where to look first', async () => {
    await open(path)
    await come(sealedFail())
    expect(wrapper!.get('h1').text()).toBe('Fail')
    expect(wrapper!.text()).toContain('String 4, D is 3.3 dB low, limit 2.5 dB')
    expect(wrapper!.text()).toContain('Likely: string 4, D is badly seated')
    expect(wrapper!.find(`a[href="/runs/${IDS.run}"]`).exists()).toBe(true)
  })

  test('does not look for causes of a pass, and gives the reason of a stop', async () => {
    await open(path)
    await come(sealedPass())
    expect(wrapper!.get('h1').text()).toBe('Pass')
    expect(wrapper!.find('.causes').exists()).toBe(false)
    await come(stoppedRun())
    expect(wrapper!.get('h1').text()).toBe('No verdict')
    expect(wrapper!.text()).toContain('Stopped: wrong instrument on the bench.')
  })

  test('takes the next scan straight away once the run has ended', async () => {
    await open(path)
    await come(sealedPass())
    await router.push('/check/HL2401873')
    await flushPromises()
    expect(wrapper!.find('form.start').exists()).toBe(true)
  })
})

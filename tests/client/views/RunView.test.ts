import { flushPromises, mount, type VueWrapper } from '@vue/test-utils'
import { createPinia, setActivePinia } from 'pinia'
import { afterEach, beforeEach, describe, expect, test, vi } from 'vitest'
import { createMemoryHistory, createRouter } from 'vue-router'
import { ApiProblem } from '../../../src/api/apiProblem.ts'
import type { RunHandlers } from '../../../src/api/socket.ts'
import { ERRORS } from '../../../src/shared/contract/errors.ts'
import type { RecomputeReport } from '../../../src/shared/contract/runs.ts'
import RunView from '../../../src/views/RunView.vue'
import { IDS } from '../../fixtures/runParts.ts'
import { liveAt, sealedFail, stoppedRun } from '../../fixtures/runViews.ts'

interface Outside {
  answers: Record<string, () => unknown>
  handlers: unknown
}
const outside = vi.hoisted((): Outside => ({ answers: {}, handlers: null }))
vi.mock('../../../src/api/http.ts', () => ({
  api: (key: string) => Promise.resolve().then(() => outside.answers[key]!()),
  http: { onSession: () => () => undefined },
}))
vi.mock('../../../src/api/socket.ts', async () => {
  const { ref, shallowRef } = await import('vue')
  return {
    live: {
      state: ref('connected'),
      lostAt: shallowRef(null),
      onSessionEnded: () => () => undefined,
      watchRun: (_run: string, handlers: unknown) => {
        outside.handlers = handlers
        return () => undefined
      },
    },
  }
})
// The page of a test has no canvas.
vi.mock('../../../src/components/charts/LevelStripChart.vue', () => ({ default: { template: '<div />' } }))
vi.mock('../../../src/components/charts/TraceChart.vue', () => ({ default: { template: '<div />' } }))

const SHA = '9f2c4a7be01d5583c6aa1e77b40d92f35e8871ab6cc04f19d2e35b7088a1c4f6'
const report: RecomputeReport = {
  run: IDS.run,
  serial: 'HL2401873',
  sameVerdict: true,
  sameBits: true,
  sameRuntime: true,
  largestDifference: 0,
  differences: [],
}

let wrapper: VueWrapper | null = null

async function open(): Promise<VueWrapper> {
  const empty = { template: '<div />' }
  const router = createRouter({
    history: createMemoryHistory(),
    routes: [
      { path: '/runs/:id', name: 'run', component: RunView },
      { path: '/check/:serial?', name: 'check', component: empty },
      { path: '/instruments/:serial', name: 'instrument', component: empty },
    ],
  })
  await router.push(`/runs/${IDS.run}`)
  wrapper = mount({ template: '<RouterView />' }, { global: { plugins: [router] }, attachTo: document.body })
  await flushPromises()
  return wrapper
}
const rowsOf = (label: string) =>
  wrapper!
    .get(`[aria-label="${label}"]`)
    .findAll('tbody tr')
    .map((row) => row.text().replace(/\s+/g, ' '))
async function computeAgain(): Promise<string> {
  await wrapper!
    .findAll('button')
    .find((button) => button.text() === 'Compute again')!
    .trigger('click')
  await flushPromises()
  return wrapper!.get('.recompute').text()
}

beforeEach(() => {
  setActivePinia(createPinia())
  outside.handlers = null
  outside.answers = {
    'runs.read': () => sealedFail(),
    'runs.recompute': () => report,
    'runs.trace': () => ({
      run: IDS.run,
      frameMs: 10,
      frames: 6180,
      framesPerPoint: 3,
      levelMdb: [[], [], [], [], [], []],
      jackMdb: [],
      segments: [{ no: 0, fromFrame: 0, frames: 3000, sha256: SHA, bytes: 43_210 }],
    }),
  }
})
afterEach(() => {
  wrapper?.unmount()
  wrapper = null
  document.body.innerHTML = ''
})

describe('RunView', () => {
  test('has a row for every rule result, with value, U, n, limit, margin, probability and why', async () => {
    await open()
    const rows = rowsOf('Rule results')
    expect(rows).toHaveLength(sealedFail().measured.results.length)
    const low = wrapper!
      .get('[aria-label="Rule results"]')
      .findAll('tbody tr')
      .find((row) => /^Balance\s*4 D/.test(row.text()))!
    expect(low.findAll('td').map((cell) => cell.text())).toEqual([
      '4 D',
      'outside',
      '\u22123.3 dB',
      '\u00b10.7',
      '3',
      '\u22122.5 to +2.5 dB',
      '\u22120.8 dB',
      '2 %',
      'beyond the limit',
    ])
  })

  test('shows kept and dropped plucks with their reasons', async () => {
    await open()
    const rows = rowsOf('Plucks')
    expect(rows.filter((row) => row.includes('dropped'))).toHaveLength(2)
    expect(rows.some((row) => row.includes('Two strings at once'))).toBe(true)
    expect(rows.some((row) => row.includes('repeated: wrong string was plucked'))).toBe(true)
  })

  test('shows conditions, method, what people did and the segments with their SHA-256', async () => {
    await open()
    for (const part of [
      'Light 12-53',
      'LC-7, revision 7',
      'node 20.20.0',
      'String 3 repeated',
      '3480',
      SHA,
    ]) {
      expect(wrapper!.text()).toContain(part)
    }
  })

  test('computes again and says whether verdict and bits are the same', async () => {
    await open()
    expect(await computeAgain()).toContain('Same verdict, same numbers to the last bit.')
    outside.answers['runs.recompute'] = () => ({
      ...report,
      sameVerdict: false,
      sameBits: false,
      largestDifference: 0.00123,
      differences: ['balance 4: -3.3 stored, -2.4 computed'],
    })
    const text = await computeAgain()
    expect(text).toContain('Another verdict, largest difference 1.2e-3 on the same runtime.')
    expect(text).toContain('balance 4: -3.3 stored, -2.4 computed')
    expect(wrapper!.find('.recompute .bad').exists()).toBe(true)
  })

  test('follows a run that is being measured until it is sealed', async () => {
    outside.answers['runs.read'] = () => liveAt('noise')
    await open()
    const handlers = outside.handlers as RunHandlers
    handlers.onView(liveAt('strings'))
    await flushPromises()
    expect(wrapper!.get('.now').text()).toContain('Damp, then pluck string 4, D')
    expect(wrapper!.text()).not.toContain('Compute again')
    handlers.onView(sealedFail())
    await flushPromises()
    expect(wrapper!.find('.now').exists()).toBe(false)
    expect(wrapper!.get('.outcome').text()).toBe('Fail')
    expect(wrapper!.text()).toContain('Compute again')
  })

  test('says beside the verdict that a practice run counts for nothing', async () => {
    outside.answers['runs.read'] = () => ({ ...sealedFail(), reason: 'practice' })
    await open()
    expect(wrapper!.get('.outcome').text()).toContain('Practice, counts for nothing')
  })

  test('gives the reason of a stopped run', async () => {
    outside.answers['runs.read'] = () => stoppedRun()
    await open()
    expect(wrapper!.get('.outcome').text()).toContain('Stopped: wrong instrument on the bench')
  })

  test('says what is wrong when the run cannot be read', async () => {
    const code = 'run.unknown'
    outside.answers['runs.read'] = () => {
      throw new ApiProblem({ type: '', code, status: 404, ...ERRORS[code] })
    }
    await open()
    expect(wrapper!.get('[role="alert"]').text()).toContain('There is no such run.')
  })
})

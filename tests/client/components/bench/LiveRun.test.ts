import { mount, type VueWrapper } from '@vue/test-utils'
import { createPinia, setActivePinia } from 'pinia'
import { afterEach, beforeEach, describe, expect, test, vi, type Mock } from 'vitest'
import { nextTick } from 'vue'
import { ApiProblem } from '../../../../src/api/apiProblem.ts'
import type { RunHandlers } from '../../../../src/api/socket.ts'
import LiveRun from '../../../../src/components/bench/LiveRun.vue'
import { ERRORS } from '../../../../src/shared/contract/errors.ts'
import type { RunActionBody, RunView } from '../../../../src/shared/contract/runs.ts'
import { useLiveStore } from '../../../../src/stores/live.ts'
import { benchSilent, judgedNotStored, liveAt, liveWithLowString } from '../../../fixtures/runViews.ts'

interface Outside {
  api: Mock<(key: string, parts: { body: { action: unknown } }) => Promise<unknown>>
  handlers: unknown
  state: { value: string }
}
const outside = vi.hoisted((): Outside => ({ api: vi.fn(), handlers: null, state: { value: '' } }))
vi.mock('../../../../src/api/http.ts', () => ({
  api: outside.api,
  http: { onSession: () => () => undefined },
}))
vi.mock('../../../../src/api/socket.ts', async () => {
  const { ref, shallowRef } = await import('vue')
  outside.state = ref('connected')
  return {
    live: {
      state: outside.state,
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
vi.mock('../../../../src/components/charts/LevelStripChart.vue', () => ({ default: { template: '<div />' } }))

let wrapper: VueWrapper | null = null

function show(view: RunView, isMine = true): VueWrapper {
  useLiveStore().watch(view.id)
  ;(outside.handlers as RunHandlers).onView(view)
  wrapper = mount(LiveRun, { props: { view, isMine }, attachTo: document.body })
  vi.advanceTimersByTime(1000)
  return wrapper
}
const acted = () => outside.api.mock.calls.map(([, parts]) => parts.body.action as RunActionBody)

function key(name: string, code: string, type = 'keydown', target: EventTarget = document.body): void {
  target.dispatchEvent(new KeyboardEvent(type, { key: name, code, bubbles: true, cancelable: true }))
}
async function press(name: string, code: string): Promise<void> {
  key(name, code)
  key(name, code, 'keyup')
  await vi.advanceTimersByTimeAsync(300)
}
async function scan(text: string): Promise<void> {
  for (const character of text) {
    key(
      character,
      /\d/.test(character) ? `Digit${character}` : character === ' ' ? 'Space' : `Key${character}`,
    )
    await vi.advanceTimersByTimeAsync(10)
  }
  key('Enter', 'Enter')
  await vi.advanceTimersByTimeAsync(500)
}
async function holdEscape(ms: number): Promise<void> {
  key('Escape', 'Escape')
  await vi.advanceTimersByTimeAsync(ms)
  key('Escape', 'Escape', 'keyup')
  await nextTick()
}

beforeEach(() => {
  vi.useFakeTimers()
  // happy-dom stamps events by the real clock.
  vi.spyOn(Event.prototype, 'timeStamp', 'get').mockImplementation(() => performance.now())
  setActivePinia(createPinia())
  outside.api.mockReset()
  outside.api.mockResolvedValue(liveAt('strings'))
  outside.state.value = 'connected'
})
afterEach(() => {
  wrapper?.unmount()
  wrapper = null
  vi.restoreAllMocks()
  vi.useRealTimers()
})

describe('LiveRun', () => {
  test('says in one sentence what to do next', () => {
    expect(show(liveAt('strings')).get('h1').text()).toBe('Damp, then pluck string 4, D')
    wrapper!.unmount()
    expect(show(liveAt('noise')).get('h1').text()).toBe('Keep them muted')
  })

  test('goes on at Space', async () => {
    show(liveAt('strings'))
    await press(' ', 'Space')
    expect(acted()).toEqual([{ kind: 'goOn' }])
  })

  test('does nothing at a scanned serial, even one with R, Space and digits in it', async () => {
    show(liveWithLowString())
    await scan('HR24 R18731')
    expect(acted()).toEqual([])
    expect(wrapper!.text()).not.toContain('Repeat a string: why?')
  })

  test('repeats the string plucked last: R, then a number', async () => {
    show(liveWithLowString())
    await press('r', 'KeyR')
    expect(wrapper!.text()).toContain('Repeat a string: why?')
    expect(wrapper!.get('[aria-pressed="true"]').text()).toContain('4')
    await press('2', 'Digit2')
    expect(acted()).toEqual([{ kind: 'repeatString', stringNo: 4, reason: 'a finger or cloth touched it' }])
    expect(wrapper!.text()).not.toContain('Repeat a string: why?')
  })

  test('never covers the line with the question', async () => {
    show(liveWithLowString())
    await press('r', 'KeyR')
    const main = wrapper!.get('.main').element
    expect(main.querySelector('.even-line')).not.toBeNull()
    expect(main.textContent).not.toContain('Repeat a string: why?')
    expect(document.querySelector('[role="dialog"], .el-overlay')).toBeNull()
  })

  test('stops after a held Escape and a reason, not after a short one', async () => {
    show(liveAt('strings'))
    await holdEscape(600)
    expect(wrapper!.text()).not.toContain('Stop the check: why?')
    await holdEscape(1100)
    expect(wrapper!.text()).toContain('Stop the check: why?')
    expect(acted()).toEqual([])
    await press('1', 'Digit1')
    expect(acted()).toEqual([{ kind: 'stop', reason: 'wrong instrument on the bench' }])
  })

  test('goes back from a question at a short Escape', async () => {
    show(liveWithLowString())
    await press('r', 'KeyR')
    await holdEscape(200)
    expect(wrapper!.text()).not.toContain('Repeat a string: why?')
    expect(acted()).toEqual([])
  })

  test('says why there is nothing to repeat', async () => {
    show(liveAt('noise'))
    await press('r', 'KeyR')
    expect(wrapper!.get('.notice').text()).toBe('No string to repeat yet.')
  })

  test('says why the last pluck was dropped, and later shows the hint again', async () => {
    const view = liveWithLowString()
    show(view)
    const pluck = view.measured.plucks.at(-1)!
    ;(outside.handlers as Required<RunHandlers>).onPluck({ run: view.id, stringNo: 4, pluck })
    await nextTick()
    expect(wrapper!.get('.notice').text()).toBe(
      'String 4 dropped. Another string still rang. Damp all first.',
    )
    await vi.advanceTimersByTimeAsync(6100)
    expect(wrapper!.get('.notice').text()).toBe('')
    expect(wrapper!.find('.hint').exists()).toBe(true)
  })

  test('says why a key was refused', async () => {
    const code = 'run.action-not-now'
    outside.api.mockRejectedValue(new ApiProblem({ type: '', code, status: 409, ...ERRORS[code] }))
    show(liveAt('noise'))
    await press(' ', 'Space')
    expect(wrapper!.get('.notice').text()).toBe(`${ERRORS[code].title} ${ERRORS[code].remedy}`)
  })

  test('says when the connection is lost, and when the bench is silent', async () => {
    show(benchSilent())
    expect(wrapper!.get('.notice').text()).toContain('The bench is silent.')
    outside.state.value = 'reconnecting'
    await nextTick()
    expect(wrapper!.get('.notice').text()).toContain('Connection lost.')
  })

  test('keeps a key while the server is away and sends it when it is back', async () => {
    outside.api.mockRejectedValueOnce(new ApiProblem('client.offline'))
    show(liveAt('strings'))
    await press(' ', 'Space')
    await vi.advanceTimersByTimeAsync(1000)
    expect(acted()).toEqual([{ kind: 'goOn' }, { kind: 'goOn' }])
    const ids = outside.api.mock.calls.map(([, parts]) => (parts.body as { id?: string }).id)
    expect(ids[0]).toBe(ids[1])
  })

  test('only shows to whoever did not open it', async () => {
    show(liveWithLowString(), false)
    await press(' ', 'Space')
    await press('r', 'KeyR')
    await holdEscape(1200)
    expect(acted()).toEqual([])
    expect(wrapper!.text()).toContain('You are watching. Bench hand does this check at bench Window.')
    expect(wrapper!.text()).not.toContain('Plucked, nothing came')
  })

  test('says that a repeated string is set aside', async () => {
    outside.api.mockResolvedValue(liveWithLowString())
    show(liveWithLowString())
    await press('r', 'KeyR')
    await press('2', 'Digit2')
    expect(wrapper!.get('.notice').text()).toBe('String 4 set aside. Pluck it again.')
  })

  test('counts what was plucked and not heard', async () => {
    const before = liveAt('strings')
    const strings = before.measured.strings.map((s) => (s.stringNo === 4 ? { ...s, noSignalCount: 1 } : s))
    outside.api.mockResolvedValue({ ...before, measured: { ...before.measured, strings } })
    show(before)
    await press(' ', 'Space')
    expect(wrapper!.get('.notice').text()).toBe('String 4: nothing came, 1 of 3.')
  })

  test('keeps why the last pluck was dropped in the hint', () => {
    show(liveWithLowString())
    expect(wrapper!.get('.hint').text()).toBe(
      'The last pluck did not count. Another string still rang. Damp all first.',
    )
  })

  test('says in the line above that a practice run counts for nothing', () => {
    show({ ...liveAt('strings'), reason: 'practice' })
    expect(wrapper!.get('.context').text()).toContain('Practice, counts for nothing')
  })

  test('tells whoever did it before by whom it was taken over', () => {
    const view = liveAt('strings')
    const taken = {
      id: view.id,
      no: 1,
      frame: 500,
      userId: view.openedBy.id,
      person: view.openedBy.name,
      at: view.openedAt,
      action: { kind: 'changePerson' as const, person: view.openedBy.name },
    }
    show({ ...view, actions: [taken] }, false)
    expect(wrapper!.get('.notice').text()).toBe('Bench hand has taken this check over. You are watching.')
  })

  test('asks to leave it plugged in once storing takes longer than a second', async () => {
    const view = judgedNotStored()
    useLiveStore().watch(view.id)
    ;(outside.handlers as RunHandlers).onView(view)
    wrapper = mount(LiveRun, { props: { view, isMine: true }, attachTo: document.body })
    await vi.advanceTimersByTimeAsync(900)
    expect(wrapper.get('h1').text()).toBe('Done')
    await vi.advanceTimersByTimeAsync(200)
    expect(wrapper.get('h1').text()).toBe('Judged, not yet stored: leave it plugged in')
    await press(' ', 'Space')
    expect(acted()).toEqual([])
  })
})

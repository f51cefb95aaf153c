import { afterEach, beforeEach, describe, expect, test, vi } from 'vitest'
import { effectScope, ref, type EffectScope, type Ref } from 'vue'
import { benchKeyOf, useBenchKeys } from '../../../src/composables/useBenchKeys.ts'

interface Key {
  key: string
  code: string
}
const keyOf = (character: string): Key =>
  character === ' '
    ? { key: ' ', code: 'Space' }
    : /[0-9]/.test(character)
      ? { key: character, code: `Digit${character}` }
      : { key: character, code: `Key${character.toUpperCase()}` }
const ENTER: Key = { key: 'Enter', code: 'Enter' }
const SHIFT: Key = { key: 'Shift', code: 'ShiftLeft' }
const ESCAPE: Key = { key: 'Escape', code: 'Escape' }
const SPACE = keyOf(' ')

let scope: EffectScope
let enabled: Ref<boolean>
let holdProgress: Ref<number>
const calls: string[] = []

function down(key: Key, init: KeyboardEventInit = {}, target: EventTarget = document.body): KeyboardEvent {
  const event = new KeyboardEvent('keydown', { ...key, bubbles: true, cancelable: true, ...init })
  target.dispatchEvent(event)
  return event
}
function up(key: Key, target: EventTarget = document.body): void {
  target.dispatchEvent(new KeyboardEvent('keyup', { ...key, bubbles: true, cancelable: true }))
}
function press(key: Key, target?: EventTarget): void {
  down(key, {}, target)
  up(key, target)
}
/** As a scanner types: every key the given time after the one before, capitals with Shift. */
function scan(text: string, gapMs: number, end: Key[] = [ENTER], withShift = true): void {
  const keys = [
    ...[...text].flatMap((c) => (withShift && /[A-Z]/.test(c) ? [SHIFT, keyOf(c)] : [keyOf(c)])),
    ...end,
  ]
  for (const key of keys) {
    press(key)
    vi.advanceTimersByTime(gapMs)
  }
}
const quiet = () => vi.advanceTimersByTime(500)

beforeEach(() => {
  vi.useFakeTimers()
  calls.length = 0
  document.body.innerHTML = ''
  enabled = ref(true)
  scope = effectScope()
  scope.run(() => {
    const actions = {
      goOn: () => calls.push('goOn'),
      repeat: () => calls.push('repeat'),
      stop: () => calls.push('stop'),
      cancel: () => calls.push('cancel'),
      digit: (digit: number) => calls.push(`digit ${digit}`),
      enabled,
    }
    holdProgress = useBenchKeys(actions, window, () => performance.now()).holdProgress
  })
  quiet()
})
afterEach(() => {
  scope.stop()
  vi.useRealTimers()
})

describe('a key on its own', () => {
  test('useBenchKeys() goes on at Space, but not before 80 ms have passed without another key', () => {
    press(SPACE)
    vi.advanceTimersByTime(79)
    expect(calls).toEqual([])
    vi.advanceTimersByTime(1)
    expect(calls).toEqual(['goOn'])
  })

  test('useBenchKeys() repeats a string at r and at R', () => {
    press(keyOf('r'))
    quiet()
    press(keyOf('R'))
    quiet()
    expect(calls).toEqual(['repeat', 'repeat'])
  })

  test('useBenchKeys() takes Shift and R of a slow hand as R', () => {
    down(SHIFT)
    vi.advanceTimersByTime(40)
    press(keyOf('R'))
    up(SHIFT)
    quiet()
    expect(calls).toEqual(['repeat'])
  })

  test('useBenchKeys() hands on a digit', () => {
    press(keyOf('3'))
    quiet()
    expect(calls).toEqual(['digit 3'])
  })

  test('useBenchKeys() acts once while a pedal is held down and the key repeats', () => {
    const first = down(SPACE)
    vi.advanceTimersByTime(400)
    for (let i = 0; i < 20; i++) {
      expect(down(SPACE, { repeat: true }).defaultPrevented).toBe(true)
      vi.advanceTimersByTime(30)
    }
    up(SPACE)
    quiet()
    expect(first.defaultPrevented).toBe(true)
    expect(calls).toEqual(['goOn'])
  })

  test('useBenchKeys() takes two presses 100 ms apart as two', () => {
    press(SPACE)
    vi.advanceTimersByTime(100)
    press(SPACE)
    quiet()
    expect(calls).toEqual(['goOn', 'goOn'])
  })
})

describe('a scanned serial is never a command', () => {
  test.each([
    ['HL2401873', 5],
    ['HL2401873', 60],
    ['RR24R1873', 20],
    ['R2401873', 79],
    ['HL240187R', 20],
    ['R R 1 R', 30],
  ])('useBenchKeys() does nothing for %s with %i ms between keys', (text, gapMs) => {
    scan(text, gapMs)
    quiet()
    expect(calls).toEqual([])
  })

  test('useBenchKeys() does nothing for a serial that ends in R or Space and has no Enter after it', () => {
    scan('HL24R', 20, [])
    quiet()
    scan('HL24 ', 20, [], false)
    quiet()
    expect(calls).toEqual([])
  })

  test('useBenchKeys() does nothing for a slow scanner whose Shift falls between the letters', () => {
    scan('RRR', 50, [])
    quiet()
    expect(calls).toEqual([])
  })

  test('useBenchKeys() acts again when the scan is over', () => {
    scan('HR2401873', 10)
    vi.advanceTimersByTime(80)
    press(SPACE)
    quiet()
    expect(calls).toEqual(['goOn'])
  })
})

describe('keyboard layouts', () => {
  test.each([
    ['QWERTY R', { key: 'r', code: 'KeyR' }, 'repeat'],
    ['Dvorak R stands where QWERTY has O', { key: 'r', code: 'KeyO' }, 'repeat'],
    ['Dvorak P stands where QWERTY has R', { key: 'p', code: 'KeyR' }, null],
    ['Cyrillic: the place of R', { key: 'к', code: 'KeyR' }, 'repeat'],
    ['Cyrillic: another place', { key: 'щ', code: 'KeyO' }, null],
    ['AZERTY digit without Shift', { key: '&', code: 'Digit1' }, 1],
    ['number pad', { key: '4', code: 'Numpad4' }, 4],
    ['Space with a no-break space on it', { key: '\u00a0', code: 'Space' }, 'goOn'],
    ['a pedal that sends no code', { key: ' ', code: '' }, 'goOn'],
    ['number pad 0', { key: '0', code: 'Numpad0' }, null],
    ['Enter', ENTER, null],
  ] as const)('benchKeyOf() %s', (_name, event, expected) => {
    expect(benchKeyOf(event)).toBe(expected)
  })

  test('useBenchKeys() repeats at R of a Dvorak layout', () => {
    press({ key: 'r', code: 'KeyO' })
    quiet()
    expect(calls).toEqual(['repeat'])
  })
})

describe('keys that belong to something else', () => {
  test.each(['input', 'textarea', 'select'])('useBenchKeys() leaves keys in a %s alone', (tag) => {
    const field = document.body.appendChild(document.createElement(tag))
    const event = down(SPACE, {}, field)
    quiet()
    press(keyOf('r'), field)
    quiet()
    down(ESCAPE, {}, field)
    vi.advanceTimersByTime(1500)
    expect(event.defaultPrevented).toBe(false)
    expect(calls).toEqual([])
  })

  test('useBenchKeys() leaves Space on a focused button to the button, R acts', () => {
    const button = document.body.appendChild(document.createElement('button'))
    const event = down(SPACE, {}, button)
    quiet()
    press(keyOf('r'), button)
    quiet()
    expect(event.defaultPrevented).toBe(false)
    expect(calls).toEqual(['repeat'])
  })

  test('useBenchKeys() leaves Ctrl+R to the browser', () => {
    const event = down(keyOf('r'), { ctrlKey: true })
    quiet()
    expect(event.defaultPrevented).toBe(false)
    expect(calls).toEqual([])
  })

  test('useBenchKeys() does nothing when it is not enabled, nor when that ends inside the 80 ms', () => {
    enabled.value = false
    press(SPACE)
    quiet()
    enabled.value = true
    press(SPACE)
    vi.advanceTimersByTime(40)
    enabled.value = false
    quiet()
    expect(calls).toEqual([])
  })

  test('useBenchKeys() does nothing once its scope has ended', () => {
    press(SPACE)
    scope.stop()
    quiet()
    press(SPACE)
    quiet()
    expect(calls).toEqual([])
  })
})

describe('Escape', () => {
  test('useBenchKeys() stops after a held second and shows how far it is', () => {
    down(ESCAPE)
    vi.advanceTimersByTime(500)
    expect(holdProgress.value).toBeGreaterThan(0.4)
    expect(holdProgress.value).toBeLessThan(0.6)
    down(ESCAPE, { repeat: true })
    vi.advanceTimersByTime(400)
    expect(calls).toEqual([])
    vi.advanceTimersByTime(150)
    expect(calls).toEqual(['stop'])
    expect(holdProgress.value).toBe(0)
    up(ESCAPE)
    quiet()
    expect(calls).toEqual(['stop'])
  })

  test('useBenchKeys() only cancels when it is let go earlier', () => {
    down(ESCAPE)
    vi.advanceTimersByTime(700)
    up(ESCAPE)
    vi.advanceTimersByTime(2000)
    expect(calls).toEqual(['cancel'])
    expect(holdProgress.value).toBe(0)
  })

  test('useBenchKeys() gives up the hold when another key comes or the window loses the focus', () => {
    down(ESCAPE)
    vi.advanceTimersByTime(300)
    press(keyOf('H'))
    vi.advanceTimersByTime(2000)
    down(ESCAPE)
    vi.advanceTimersByTime(300)
    window.dispatchEvent(new Event('blur'))
    vi.advanceTimersByTime(2000)
    expect(calls).toEqual([])
  })
})

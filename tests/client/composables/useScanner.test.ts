import { afterEach, beforeEach, expect, test, vi } from 'vitest'
import { effectScope } from 'vue'
import type { EffectScope } from 'vue'
import { useScanner } from '../../../src/composables/useScanner.ts'

let scope: EffectScope
let scans: string[]
let clockMs: number

beforeEach(() => {
  scans = []
  clockMs = 1000
  scope = effectScope()
  scope.run(() => useScanner({ onScan: (code) => scans.push(code), timeOf: () => clockMs }))
})
afterEach(() => {
  scope.stop()
  document.body.replaceChildren()
})

function press(
  key: string,
  target: EventTarget = document.body,
  over: KeyboardEventInit = {},
): KeyboardEvent {
  const event = new KeyboardEvent('keydown', { key, bubbles: true, cancelable: true, ...over })
  target.dispatchEvent(event)
  // What a browser does with a character that nobody refused.
  if (target instanceof HTMLInputElement && key.length === 1 && !event.defaultPrevented) {
    target.value += key
    target.dispatchEvent(new Event('input', { bubbles: true }))
  }
  return event
}

/** As a scanner types: Shift before each capital, one key every gapMs, Enter at the end. */
function scan(code: string, gapMs = 8, target: EventTarget = document.body): KeyboardEvent {
  for (const character of code) {
    clockMs += gapMs
    if (/[A-Z]/.test(character)) press('Shift', target)
    press(character, target)
  }
  clockMs += gapMs
  return press('Enter', target)
}

test('useScanner() takes a burst that ends with Enter as a scan', () => {
  scan('HL2401873')
  expect(scans).toEqual(['HL2401873'])
})

test('useScanner() takes R and Space within a burst as characters of the code', () => {
  scan('RL 24R 1873')
  expect(scans).toEqual(['RL 24R 1873'])
})

test('useScanner() lets every key of a burst be seen by those who listen for single keys', () => {
  const seen: string[] = []
  const listen = (event: Event) => seen.push((event as KeyboardEvent).key)
  window.addEventListener('keydown', listen)
  scan('R101 2')
  window.removeEventListener('keydown', listen)
  expect(seen.filter((key) => key !== 'Shift')).toEqual([...'R101 2', 'Enter'])
})

test('useScanner() keeps Space of a burst from scrolling or pressing a button', () => {
  clockMs += 8
  press('R')
  clockMs += 8
  expect(press(' ').defaultPrevented).toBe(true)
})

test('useScanner() leaves a Space on its own alone', () => {
  expect(press(' ').defaultPrevented).toBe(false)
})

test('useScanner() does not take typing by hand as a scan', () => {
  expect(scan('HL2401873', 90).defaultPrevented).toBe(false)
  expect(scans).toEqual([])
})

test('useScanner() does not take two keys rolled under one hand as a scan', () => {
  scan('RR', 20)
  expect(scans).toEqual([])
})

test('useScanner() does not cut a scan in two at a hiccup', () => {
  for (const [character, gapMs] of [
    ['H', 8],
    ['L', 8],
    ['2', 140],
    ['4', 8],
    ['0', 8],
    ['1', 8],
    ['8', 8],
    ['7', 8],
  ] as const) {
    clockMs += gapMs
    press(character)
  }
  clockMs += 8
  press('Enter')
  expect(scans).toEqual(['HL240187'])
})

test('useScanner() wants Enter right after the characters', () => {
  for (const character of 'HL24018') {
    clockMs += 8
    press(character)
  }
  clockMs += 2000
  press('Enter')
  expect(scans).toEqual([])
})

test('useScanner() begins anew after a pause', () => {
  press('R')
  clockMs += 1000
  scan('HL2401873')
  expect(scans).toEqual(['HL2401873'])
})

test('useScanner() gives up a burst at a shortcut', () => {
  clockMs += 8
  press('H')
  clockMs += 8
  press('c', document.body, { ctrlKey: true })
  scan('L24')
  expect(scans).toEqual([])
})

test('useScanner() takes the characters out of the field they fell into', () => {
  const field = document.createElement('input')
  field.value = 'worn nut'
  document.body.append(field)
  const told = vi.fn()
  scan('HL2401873', 8, field)
  field.addEventListener('input', told)
  expect(scans).toEqual(['HL2401873'])
  expect(field.value).toBe('worn nut')
  scan('HL2401874', 8, field)
  // nine characters, and the taking out, so that a bound value follows
  expect(told).toHaveBeenCalledTimes(10)
  expect(field.value).toBe('worn nut')
})

test('useScanner() keeps the Enter of a scan from sending a form', () => {
  expect(scan('HL2401873').defaultPrevented).toBe(true)
})

test('useScanner() stops listening with its scope', () => {
  scope.stop()
  scan('HL2401873')
  expect(scans).toEqual([])
})

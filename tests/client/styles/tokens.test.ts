import { readFileSync } from 'node:fs'
import path from 'node:path'
import { expect, test } from 'vitest'

const css = readFileSync(path.join(import.meta.dirname, '../../../src/styles/tokens.css'), 'utf8')

function colorsOf(block: RegExp): Map<string, string> {
  const body = block.exec(css)?.[1] ?? ''
  return new Map([...body.matchAll(/--([a-z-]+):\s*(#[0-9a-f]{6});/g)].map(([, name, hex]) => [name!, hex!]))
}

/** WCAG 2.2, relative luminance. */
function luminance(hex: string): number {
  const [r, g, b] = [1, 3, 5].map((at) => {
    const part = parseInt(hex.slice(at, at + 2), 16) / 255
    return part <= 0.04045 ? part / 12.92 : ((part + 0.055) / 1.055) ** 2.4
  })
  return 0.2126 * r! + 0.7152 * g! + 0.0722 * b!
}

function contrast(a: string, b: string): number {
  const [low, high] = [luminance(a), luminance(b)].toSorted((x, y) => x - y)
  return (high! + 0.05) / (low! + 0.05)
}

const light = colorsOf(/^:root \{([^}]*)\}/m)
const dark = new Map([...light, ...colorsOf(/^:root\[data-theme='dark'\] \{([^}]*)\}/m)])
const GROUNDS = ['paper', 'panel', 'lane', 'brass-ground']
const TEXTS = ['ink', 'quiet', 'action', 'brass', 'verdict-pass', 'verdict-fail', 'verdict-none']

test('contrast() gives 21 for black on white, as WCAG says', () => {
  expect(contrast('#000000', '#ffffff')).toBeCloseTo(21, 5)
})

for (const [theme, colors] of [
  ['light', light],
  ['dark', dark],
] as const) {
  test(`${theme}: every text reads on every ground with at least 4.5 : 1`, () => {
    for (const text of TEXTS)
      for (const ground of GROUNDS)
        expect(
          contrast(colors.get(text)!, colors.get(ground)!),
          `${text} on ${ground}`,
        ).toBeGreaterThanOrEqual(4.5)
  })

  test(`${theme}: what is written on an action reads with at least 4.5 : 1`, () => {
    expect(contrast(colors.get('on-action')!, colors.get('action')!)).toBeGreaterThanOrEqual(4.5)
  })

  test(`${theme}: the edge of a field stands out with at least 3 : 1`, () => {
    for (const ground of GROUNDS)
      expect(contrast(colors.get('edge')!, colors.get(ground)!), ground).toBeGreaterThanOrEqual(3)
  })
}

test('dark gives every colour of its own', () => {
  const own = colorsOf(/^:root\[data-theme='dark'\] \{([^}]*)\}/m)
  expect([...light.keys()].filter((name) => !own.has(name))).toEqual([])
})

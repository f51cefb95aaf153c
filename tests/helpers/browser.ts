import { readFileSync } from 'node:fs'
import { createRequire } from 'node:module'
import { chromium } from 'playwright-core'
import type { Browser, BrowserContext, Page } from 'playwright-core'
import { expect } from 'vitest'
import { DEMO_PASSWORD } from '../../server/cli/seed.ts'

/** Debian's Chromium; the flags keep it from looking for anything but the page under test. */
export function launchBrowser(): Promise<Browser> {
  return chromium.launch({
    executablePath: '/usr/bin/chromium',
    args: [
      '--no-sandbox',
      '--disable-gpu',
      '--disable-quic',
      '--no-first-run',
      '--disable-background-networking',
      '--disable-component-update',
      '--disable-sync',
    ],
  })
}

export interface Look {
  scheme: 'light' | 'dark'
  width: number
  height: number
}

export const DESK: Look = { scheme: 'light', width: 1280, height: 800 }
export const TABLET_DARK: Look = { scheme: 'dark', width: 800, height: 1280 }

/** A page whose script errors fail the test that asks for them at its end. */
export async function openPage(
  browser: Browser,
  look: Look,
): Promise<{ context: BrowserContext; page: Page; errors: string[] }> {
  const context = await browser.newContext({
    viewport: { width: look.width, height: look.height },
    colorScheme: look.scheme,
  })
  const page = await context.newPage()
  page.setDefaultTimeout(20_000)
  const errors: string[] = []
  page.on('pageerror', (error) => errors.push(error.message))
  page.on('console', (message) => {
    // Refusals of the API are part of the journey and are shown by the page; the browser lists them as errors too.
    if (message.type() === 'error' && !message.text().startsWith('Failed to load resource'))
      errors.push(message.text())
  })
  return { context, page, errors }
}

export async function signInAs(page: Page, url: string, account: string): Promise<void> {
  await page.goto(`${url}/sign-in`)
  await page.getByLabel('E-mail').fill(`${account}@harrowlane.test`)
  await page.getByLabel('Password').fill(DEMO_PASSWORD)
  await page.keyboard.press('Enter')
  await page.waitForURL((at) => !at.pathname.startsWith('/sign-in'))
}

/** As a scanner types: each key down and up again, without waiting for anything between them, then Enter. */
export async function scan(page: Page, code: string): Promise<void> {
  const session = await page.context().newCDPSession(page)
  const keys = [...code].map((key) => ({ key, code: codeOf(key), text: key }))
  const events = [...keys, { key: 'Enter', code: 'Enter', text: '\r' }].flatMap((key) => [
    { type: 'keyDown' as const, ...key },
    { type: 'keyUp' as const, key: key.key, code: key.code },
  ])
  await Promise.all(events.map((event) => session.send('Input.dispatchKeyEvent', event)))
  await session.detach()
}

function codeOf(key: string): string {
  if (key === ' ') return 'Space'
  return /\d/.test(key) ? `Digit${key}` : `Key${key.toUpperCase()}`
}

/** As a person types a serial: F2, the serial, Enter. */
export async function typeSerial(page: Page, serial: string): Promise<void> {
  await page.keyboard.press('F2')
  await page.keyboard.type(serial)
  await page.keyboard.press('Enter')
}

const axeSource = readFileSync(createRequire(import.meta.url).resolve('axe-core/axe.min.js'), 'utf8')

interface AxeResult {
  violations: { id: string; impact: string | null; nodes: { html: string }[] }[]
}

/** Serious and critical findings of axe on the page as it stands (WCAG 2.2 A and AA). */
export async function seriousFindings(page: Page): Promise<string[]> {
  await page.evaluate(axeSource)
  const result = await page.evaluate<AxeResult>(
    `axe.run(document, { runOnly: ['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa'] })`,
  )
  return result.violations
    .filter((violation) => violation.impact === 'serious' || violation.impact === 'critical')
    .map(
      (violation) => `${violation.id}: ${violation.nodes.map((node) => node.html.slice(0, 120)).join(' | ')}`,
    )
}

/** Nothing wider than the window, so that nobody scrolls sideways at the bench. */
export async function expectNoSidewaysScroll(page: Page): Promise<void> {
  const wider = await page.evaluate(
    'document.documentElement.scrollWidth - document.documentElement.clientWidth',
  )
  expect(wider).toBe(0)
}

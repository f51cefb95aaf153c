import type { Browser, Page } from 'playwright-core'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { ensureBuilt } from '../../db/build.js'
import { RunView } from '../../src/shared/contract/runs.ts'
import {
  DESK,
  TABLET_DARK,
  expectNoSidewaysScroll,
  launchBrowser,
  openPage,
  scan,
  seriousFindings,
  signInAs,
  typeSerial,
} from '../helpers/browser.ts'
import type { Look } from '../helpers/browser.ts'
import { startTestServer } from '../helpers/runningServer.ts'
import type { TestPerson, TestServer } from '../helpers/runningServer.ts'
import { benchReady, startSimulator } from '../helpers/simulatorProcess.ts'

let at: TestServer
let browser: Browser
let installer: TestPerson
let benchId: string
let endBench: () => void = () => undefined

beforeAll(async () => {
  await ensureBuilt(['client'], { print: () => undefined })
  at = await startTestServer()
  browser = await launchBrowser()
  installer = await at.signIn('installer')
  endBench = startSimulator(at.url, at.benchTokens.window!, ['--bench', 'window', '--seed', '5'])
  benchId = await benchReady(installer, 'Window')
}, 120_000)

afterAll(async () => {
  endBench()
  await browser.close()
  await at.close()
})

/** Only who opened the run commands its bench. */
function simulate(body: unknown, person: TestPerson = installer): Promise<unknown> {
  return person.call('benches.simulate', { params: { id: benchId }, body })
}

/** From the sign-in to a run that has just begun, as a new installer goes. */
async function startCheck(page: Page, serial: string, account = 'installer'): Promise<void> {
  await signInAs(page, at.url, account)
  await page.getByRole('button', { name: /Choose the bench/ }).click()
  await page.getByText('Window', { exact: false }).first().click()
  await page.getByText('Scan a serial').waitFor()
  await typeSerial(page, serial)
  const cautions = page.getByRole('button', { name: 'I have read them' })
  const model = page.locator('#start-model')
  await cautions.or(model).first().waitFor()
  if (await cautions.isVisible()) await cautions.click()
  await page.locator('.el-select', { has: model }).click()
  await page.getByRole('option', { name: 'Linden concert', exact: true }).click()
  for (const label of ['Volume full, tone flat, tuner off', 'Tuned to pitch'])
    await page.getByText(label).click()
  await page.getByRole('button', { name: /Start the check/ }).click()
  await page.getByRole('heading', { level: 1, name: /Plug in|unplugged|Pull the plug/i }).waitFor()
}

async function openRunId(): Promise<string> {
  const bench = (await installer.call('benches.list')).items.find((item) => item.id === benchId)!
  return bench.openRun!.id
}

async function verdictOf(page: Page, word: string): Promise<void> {
  await page.getByRole('heading', { level: 1, name: word }).waitFor({ timeout: 60_000 })
}

async function wholeJourney(serial: string, look: Look, account: string): Promise<void> {
  const { page, errors, context } = await openPage(browser, look)
  const person = await at.signIn(account)
  await simulate({ kind: 'place', seed: 4, faults: [], scatterDb: 0.4 })
  await simulate({ kind: 'automaticHand', on: false })
  await startCheck(page, serial, account)
  expect(await seriousFindings(page)).toEqual([])
  await expectNoSidewaysScroll(page)
  const runId = await openRunId()
  await simulate({ kind: 'automaticHand', on: true, speed: 15 }, person)
  await page.getByRole('heading', { level: 1, name: /Damp, then pluck|Pluck/ }).waitFor()
  expect(await seriousFindings(page)).toEqual([])
  await verdictOf(page, 'Pass')
  expect(await seriousFindings(page)).toEqual([])

  await page.getByText('Page of this run').click()
  await page.waitForURL(`**/runs/${runId}`)
  await page.getByRole('button', { name: /Compute again/i }).click()
  await page.getByText(/same bits|bit for bit|last bit/i).waitFor()
  expect(await seriousFindings(page)).toEqual([])
  await expectNoSidewaysScroll(page)

  await page.getByRole('link', { name: 'Instruments' }).click()
  await page.getByRole('link', { name: serial }).click()
  await page.waitForURL(`**/instruments/${serial}`)
  await page.getByText('Pass').first().waitFor()
  expect(await seriousFindings(page)).toEqual([])
  await expectNoSidewaysScroll(page)
  expect(errors).toEqual([])
  await context.close()
}

test(
  'an installer goes from the sign-in to a stored verdict and finds it again, at a desk',
  { timeout: 150_000 },
  () => wholeJourney('HL2650001', DESK, 'installer'),
)

test('the same on an upright tablet in the dark', { timeout: 150_000 }, () =>
  wholeJourney('HL2650002', TABLET_DARK, 'qc'),
)

test('an open element ends in Fail and names the string', { timeout: 150_000 }, async () => {
  const { page, errors, context } = await openPage(browser, DESK)
  await simulate({ kind: 'automaticHand', on: false })
  await simulate({ kind: 'place', seed: 4, faults: [{ fault: 'elementOpen', stringNo: 2 }], scatterDb: 0.4 })
  await startCheck(page, 'HL2650003')
  await simulate({ kind: 'automaticHand', on: true, speed: 15 })
  await verdictOf(page, 'Fail')
  await page
    .getByText(/String 2/)
    .first()
    .waitFor()
  expect(await seriousFindings(page)).toEqual([])
  expect(errors).toEqual([])
  await context.close()
})

test('a scanned code with R and a space in it is a scan and no command', { timeout: 120_000 }, async () => {
  const { page, context } = await openPage(browser, DESK)
  await simulate({ kind: 'automaticHand', on: false })
  await simulate({ kind: 'place', seed: 4, faults: [], scatterDb: 0.4 })
  await startCheck(page, 'HL2650004')
  const runId = await openRunId()
  await scan(page, 'R HLR 265R')
  await page
    .getByText(/no serial|not a serial|capital letters/i)
    .first()
    .waitFor()
  const view = RunView.parse(await installer.call('runs.read', { params: { id: runId } }))
  expect(view.actions).toEqual([])
  expect(view.status).toBe('open')
  await stopRun(runId)
  await context.close()
})

test(
  'a server that goes away is told, and the screen comes back by itself with the run',
  { timeout: 150_000 },
  async () => {
    const { page, context } = await openPage(browser, DESK)
    await simulate({ kind: 'place', seed: 9, faults: [], scatterDb: 0.4 })
    await simulate({ kind: 'automaticHand', on: false })
    await startCheck(page, 'HL2650005')
    const runId = await openRunId()
    await simulate({ kind: 'automaticHand', on: true, speed: 3 })
    await page.getByRole('heading', { level: 1, name: /pluck string/ }).waitFor({ timeout: 60_000 })
    await at.restart()
    await page
      .getByText(/connect|reach|away/i)
      .first()
      .waitFor()
    await verdictOf(page, 'Pass')
    await expect
      .poll(async () => (await installer.call('runs.read', { params: { id: runId } })).storage)
      .toBe('stored')
    const report = await installer.call('runs.recompute', { params: { id: runId } })
    expect(report).toMatchObject({ sameBits: true, sameVerdict: true })
    await context.close()
  },
)

async function stopRun(runId: string): Promise<void> {
  const body = { id: crypto.randomUUID(), action: { kind: 'stop', reason: 'journey over' } }
  await installer.call('runs.act', { params: { id: runId }, body })
  await expect.poll(() => at.server.board.find(runId)).toBeUndefined()
}

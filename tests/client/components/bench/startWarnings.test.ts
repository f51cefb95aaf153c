import { describe, expect, test } from 'vitest'
import { startWarnings } from '../../../../src/components/bench/startWarnings.ts'
import type { BenchView, ModelView } from '../../../../src/shared/contract/workshop.ts'
import { IDS, aModel, aSetup, aSheet } from '../../../fixtures/runParts.ts'

const bench = (over: Partial<BenchView> = {}): BenchView => ({
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
  ...over,
})
const model = (sheet: ModelView['sheet']): ModelView => ({ ...aModel(), sheetInForce: null, sheet })
const aged = { strungMinutes: 35 }
const titles = (...args: Parameters<typeof startWarnings>) => startWarnings(...args).map((w) => w.title)

describe('startWarnings()', () => {
  test('is silent when all is well, and when nothing is known', () => {
    expect(titles(bench(), model(aSheet()), aged)).toEqual([])
    expect(titles(null, null, { strungMinutes: null })).toEqual([])
  })

  test('says that a bench without verification gives no verdict', () => {
    const [warning] = startWarnings(bench({ verified: false }), null, aged)
    expect(`${warning!.title} ${warning!.remedy}`).toContain('The verdict will be none')
  })

  test('names what has to be read by hand, and what cannot be tested here at all', () => {
    const capabilities = aSetup().capabilities.filter((one) => !['battery', 'disturbances'].includes(one))
    const warnings = startWarnings(bench({ capabilities }), model(aSheet()), aged)
    expect(warnings[0]!.title).toBe('This bench cannot measure: Battery under load.')
    expect(warnings[0]!.remedy).toContain('typed in at the end')
    expect(warnings[1]!.title).toBe(
      'Not tested on this bench: Contact disturbances; Longest contact disturbance.',
    )
    expect(warnings[1]!.remedy).toContain('the verdict will be none')
  })

  test('says of what is not required that it may be typed in during the check', () => {
    const capabilities = aSetup().capabilities.filter((one) => one !== 'battery')
    const sheet = aSheet()
    const rules = sheet.rules.map((entry) => ({
      ...entry,
      required: entry.rule !== 'battery' && entry.required,
    }))
    const [warning] = startWarnings(bench({ capabilities }), model({ ...sheet, rules }), aged)
    expect(warning!.remedy).toContain('before the wiggle ends')
    expect(warning!.remedy).not.toContain('at the end')
  })

  test('says when the pattern is not set', () => {
    expect(titles(bench(), model(aSheet({ patternDb: null })), aged)).toEqual(['Pattern not set.'])
  })

  test('warns under 10 minutes since stringing, not at 10 and not when it is not known', () => {
    expect(titles(bench(), null, { strungMinutes: 9.5 })).toEqual(['Strings are younger than 10 minutes.'])
    expect(titles(bench(), null, { strungMinutes: 10 })).toEqual([])
    expect(titles(bench(), null, { strungMinutes: null })).toEqual([])
  })
})

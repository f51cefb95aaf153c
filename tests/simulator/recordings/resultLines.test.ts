import { describe, expect, it } from 'vitest'
import type { MeasuredRun } from '../../../src/shared/contract/measured.ts'
import { startRun, viewRun } from '../../../src/shared/measure/runState.ts'
import { isAsExpected, resultLines } from '../../../simulator/recordings/resultLines.ts'
import { buildRecordingSetup } from '../../helpers/runSetup.ts'

const EXPECTED = [1, -1, 0.5, -0.5, 0.25, -0.25]

/** A run of which only the balances matter here. */
function runWith(balances: readonly (number | null)[]): MeasuredRun {
  const run = viewRun(startRun(buildRecordingSetup()))
  return {
    ...run,
    verdict: 'pass',
    strings: run.strings.map((string, i) => ({
      ...string,
      accepted: 3,
      sDb: 1,
      balance: { ...string.balance, value: balances[i]!, expandedU: 0.4 },
    })),
  }
}

describe('isAsExpected()', () => {
  it('allows 0.10 dB and not more', () => {
    expect(isAsExpected(runWith(EXPECTED.map((db) => db + 0.099)), EXPECTED)).toBe(true)
    expect(isAsExpected(runWith(EXPECTED.with(3, -0.39)), EXPECTED)).toBe(false)
  })

  it('is not met by a balance that is missing or only a bound', () => {
    expect(isAsExpected(runWith([null, ...EXPECTED.slice(1)]), EXPECTED)).toBe(false)
    const censored = runWith(EXPECTED)
    censored.strings[0]!.balance.atMost = true
    expect(isAsExpected(censored, EXPECTED)).toBe(false)
  })
})

describe('resultLines()', () => {
  it('lays six balances beside the expected ones and ends with the verdict', () => {
    const lines = resultLines(runWith(EXPECTED.with(1, -1.05)), EXPECTED)
    expect(lines[0]).toMatch(/string +plucks +level dBV +balance dB +U dB +s dB +expected dB +off dB/)
    expect(lines[2]).toMatch(/2 B +3 +- +-1\.05 +0\.40 +1\.00 +-1\.00 +-0\.050/)
    expect(lines.at(-1)).toBe('Verdict: pass')
  })

  it('names what was dropped, and has no comparison where nothing is expected', () => {
    const run = runWith(EXPECTED)
    run.plucks = [
      {
        no: 4,
        onsetFrame: 300,
        stringNo: 3,
        toldBy: 'pitch',
        milliHz: 196_000,
        levelDb: null,
        rawDb: null,
        atMost: false,
        separationDb: null,
        dropped: 'strum',
      },
    ]
    const lines = resultLines(run, null)
    expect(lines).toContain('Pluck 4 of string 3 was dropped: strum.')
    expect(lines[0]).not.toMatch(/expected/)
  })
})

import { describe, expect, it } from 'vitest'
import { NOT_MEASURED_MDB, SILENCE_MDB } from '../../../src/shared/contract/quantities.ts'
import type { BenchVerify } from '../../../src/shared/contract/frames.ts'
import { VERIFY_LIMITS, verifyBench } from '../../../src/shared/measure/verifyBench.ts'

const CHANNELS = [1, 2, 3, 4, 5, 6]

/** A six-channel bench that reads everything right; `offMdb` on one channel. */
function readings(
  change: Partial<BenchVerify> = {},
  off: { channel?: number; offMdb?: number } = {},
): BenchVerify {
  const offOf = (channel: number) => (channel === off.channel ? off.offMdb! : 0)
  return {
    id: '0b6f2d5e-3c0a-4a39-9a44-1f2d7a4f0c09',
    checkStandard: 'CS-1',
    tones: CHANNELS.flatMap((channel) =>
      [-20_000, -40_000].map((appliedMdb) => ({
        channel,
        appliedMdb,
        measuredMdb: appliedMdb + offOf(channel),
      })),
    ),
    quiet: CHANNELS.map((channel) => ({ channel, flatMdb: -101_000 - channel * 100, aMdb: -108_000 })),
    resistances: [
      { appliedMicroOhm: 0, measuredMicroOhm: 1000 },
      { appliedMicroOhm: 100_000, measuredMicroOhm: 104_000 },
      { appliedMicroOhm: 1_000_000, measuredMicroOhm: 993_000 },
      { appliedMicroOhm: null, measuredMicroOhm: null },
    ],
    currents: [{ appliedUa: 1000, measuredUa: 1004 }],
    ...change,
  }
}
const claims = { capabilities: ['sixLevels', 'contactResistance', 'current'] as const }

describe('verifyBench()', () => {
  it('passes a bench that reads its check standard right, and gives its floors and corrections', () => {
    const { passed, reasons, floorDb, correctionDb } = verifyBench(readings(), claims)
    expect(reasons).toEqual([])
    expect(passed).toBe(true)
    expect(floorDb).toEqual([-101.1, -101.2, -101.3, -101.4, -101.5, -101.6])
    expect(correctionDb).toEqual([0, 0, 0, 0, 0, 0])
  })

  it('takes 0.3 dB and not 0.301 dB, above and below', () => {
    for (const [offMdb, passed] of [
      [300, true],
      [-300, true],
      [301, false],
      [-301, false],
    ] as const) {
      expect(verifyBench(readings({}, { channel: 4, offMdb })).passed).toBe(passed)
    }
    const off = verifyBench(readings({}, { channel: 4, offMdb: 500 }))
    expect(off.reasons).toHaveLength(2)
    expect(off.reasons[0]).toBe('element 4 reads 0.50 dB off at -20.0 dBV')
    expect(off.correctionDb[3]).toBeCloseTo(-0.5, 12)
  })

  it('judges with the calibration of today added', () => {
    const raw = readings({}, { channel: 4, offMdb: -2000 })
    expect(verifyBench(raw).passed).toBe(false)
    const calibrated = verifyBench(raw, { calibrationDb: [0, 0, 0, 2, 0, 0] })
    expect(calibrated.passed).toBe(true)
    expect(calibrated.floorDb[3]).toBeCloseTo(-99.4, 9)
  })

  it.each([SILENCE_MDB, NOT_MEASURED_MDB])('does not take %d for a level', (measuredMdb) => {
    const tones = readings().tones.map((tone, i) => (i === 3 ? { ...tone, measuredMdb } : tone))
    expect(verifyBench(readings({ tones })).reasons).toEqual(['element 2 reads nothing at -40.0 dBV'])
  })

  it('fails a channel that was given one level only, or none', () => {
    const one = readings().tones.filter((tone) => tone.channel !== 6 || tone.appliedMdb === -20_000)
    expect(verifyBench(readings({ tones: one })).reasons).toEqual(['element 6 was not tried at two levels'])
    const none = readings().tones.filter((tone) => tone.channel !== 6)
    expect(verifyBench(readings({ tones: none })).passed).toBe(false)
  })

  it('fails a noisy quiet source and a missing one', () => {
    const quiet = readings().quiet
    const noisy = quiet.map((source, i) =>
      i === 0 ? { ...source, flatMdb: VERIFY_LIMITS.quietFlatDb * 1000 + 1 } : source,
    )
    expect(verifyBench(readings({ quiet: noisy })).reasons[0]).toMatch(/^element 1 is too noisy/)
    const hissing = quiet.map((source, i) =>
      i === 0 ? { ...source, aMdb: VERIFY_LIMITS.quietADb * 1000 + 1 } : source,
    )
    expect(verifyBench(readings({ quiet: hissing })).reasons[0]).toMatch(/A-weighted$/)
    expect(verifyBench(readings({ quiet: quiet.slice(1) })).reasons).toEqual([
      'element 1 was not tried with the quiet source',
    ])
  })

  it('takes digital silence as quiet, with a floor below any converter', () => {
    const quiet = readings().quiet.map((source) => ({ ...source, flatMdb: SILENCE_MDB, aMdb: SILENCE_MDB }))
    expect(verifyBench(readings({ quiet }))).toMatchObject({
      passed: true,
      floorDb: [-200, -200, -200, -200, -200, -200],
    })
  })

  it('takes 10 milliohm and not more, and open as open', () => {
    const resistance = (appliedMicroOhm: number | null, measuredMicroOhm: number | null) =>
      verifyBench(readings({ resistances: [{ appliedMicroOhm, measuredMicroOhm }] })).passed
    expect(resistance(100_000, 110_000)).toBe(true)
    expect(resistance(100_000, 110_001)).toBe(false)
    expect(resistance(100_000, null)).toBe(false)
    expect(resistance(null, 2_000_000_000)).toBe(true)
    expect(resistance(null, 50_000_000)).toBe(false)
  })

  it('fails what the bench claims to measure and was not tried', () => {
    const missing = readings({ resistances: [], currents: [] })
    expect(verifyBench(missing, claims).reasons).toEqual([
      'resistance was not tried at 0 ohm, a known one and open',
      'the supply current was not tried',
    ])
    expect(verifyBench(missing, { capabilities: ['sixLevels'] }).passed).toBe(true)
  })

  it('fails a current that is off', () => {
    expect(verifyBench(readings({ currents: [{ appliedUa: 1000, measuredUa: 1081 }] })).passed).toBe(false)
    expect(verifyBench(readings({ currents: [{ appliedUa: 1000, measuredUa: 1080 }] })).passed).toBe(true)
  })

  it('needs the jack alone of a one-channel bench', () => {
    const tones = [-20_000, -40_000].map((appliedMdb) => ({
      channel: 0,
      appliedMdb,
      measuredMdb: appliedMdb,
    }))
    const quiet = [{ channel: 0, flatMdb: -99_000, aMdb: -105_000 }]
    expect(verifyBench(readings({ tones, quiet }))).toMatchObject({ passed: true, floorDb: [-99] })
    expect(verifyBench(readings({ tones, quiet }), { channelKind: 'six' }).passed).toBe(false)
  })
})

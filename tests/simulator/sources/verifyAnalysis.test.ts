import { describe, expect, it } from 'vitest'
import { BenchVerify } from '../../../src/shared/contract/frames.ts'
import { verifyBench } from '../../../src/shared/measure/verifyBench.ts'
import { verifyAnalysis } from '../../../simulator/sources/verifyAnalysis.ts'

const settings = { rateHz: 44_100, frameMs: 5 as const, fullScale: 1, offsetDb: [0, 1, 2, 3, 4, -12.5] }

describe('verifyAnalysis()', () => {
  it('reads computed tones within 0.05 dB on every channel, at two levels, and silence as silence', () => {
    const verify = verifyAnalysis(settings)
    expect(BenchVerify.parse(verify)).toEqual(verify)
    expect(verify.tones).toHaveLength(12)
    for (const { appliedMdb, measuredMdb } of verify.tones)
      expect(Math.abs(measuredMdb - appliedMdb)).toBeLessThan(50)
    expect(verify.tones.map(({ appliedMdb }) => appliedMdb).slice(0, 6)).toEqual([
      -10_000, -9_000, -8_000, -7_000, -6_000, -22_500,
    ])
    expect(verifyBench(verify)).toMatchObject({ passed: true, reasons: [] })
  })

  it('is about the jack when there is one channel', () => {
    const verify = verifyAnalysis({ ...settings, offsetDb: [6] })
    expect(new Set([...verify.tones, ...verify.quiet].map(({ channel }) => channel))).toEqual(new Set([0]))
    expect(verifyBench(verify).passed).toBe(true)
  })
})

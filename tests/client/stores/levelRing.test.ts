import { describe, expect, test } from 'vitest'
import type { LiveLevels } from '../../../src/shared/contract/live.ts'
import { NOT_MEASURED_MDB, SILENCE_MDB } from '../../../src/shared/contract/quantities.ts'
import { SILENCE_DRAWN_DB, createLevelRing } from '../../../src/stores/levelRing.ts'
import { IDS } from '../../fixtures/runParts.ts'

const levels = (frame: number, levelMdb: number[]): LiveLevels => ({
  run: IDS.run,
  frame,
  levelMdb,
  jackMdb: -20_000,
  plugged: true,
  ringSleeveClosed: true,
  tipClosed: true,
})

describe('createLevelRing()', () => {
  test('keeps seconds and dBV in columns, silence below all, not measured as a gap', () => {
    const ring = createLevelRing(10)
    ring.push(levels(100, [-21_500, SILENCE_MDB]), 10)
    ring.push(levels(105, [NOT_MEASURED_MDB, -90_000]), 10)
    expect(ring.columns()).toEqual([
      [1, 1.05],
      [-21.5, null],
      [SILENCE_DRAWN_DB, -90],
    ])
  })

  test('drops what is older than its seconds, from every column', () => {
    const ring = createLevelRing(2)
    for (let frame = 0; frame <= 1000; frame += 5) ring.push(levels(frame, [-frame]), 10)
    const [times, first] = ring.columns()
    expect(times![0]).toBe(8)
    expect(times!.at(-1)).toBe(10)
    expect(first).toHaveLength(times!.length)
    expect(times).toHaveLength(41)
  })

  test('never holds more than the most, however short the frames', () => {
    const ring = createLevelRing(1000, 50)
    for (let frame = 0; frame < 500; frame++) ring.push(levels(frame, [-1000]), 5)
    expect(ring.columns()[0]).toHaveLength(50)
  })

  test('begins anew when frames come again after a restart, and takes one frame once', () => {
    const ring = createLevelRing(10)
    ring.push(levels(500, [-1000]), 10)
    ring.push(levels(500, [-2000]), 10)
    expect(ring.columns()).toEqual([[5], [-1]])
    ring.push(levels(300, [-3000]), 10)
    expect(ring.columns()).toEqual([[3], [-3]])
  })

  test('begins anew when the number of channels changes', () => {
    const ring = createLevelRing(10)
    ring.push(levels(1, [-1000]), 10)
    ring.push(levels(2, [-1000, -2000]), 10)
    expect(ring.columns()).toEqual([[0.02], [-1], [-2]])
  })
})

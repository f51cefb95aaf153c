import { describe, expect, it } from 'vitest'
import { SILENCE_MDB } from '../../../src/shared/contract/quantities.ts'
import { OnsetDetector } from '../../../simulator/signal/onsetDetector.ts'

const onsetsIn = (levelsMdb: number[], lowestMdb = -110_000) => {
  const detector = new OnsetDetector(10, lowestMdb)
  return levelsMdb.flatMap((level, frame) => (detector.push(level) ? [frame] : []))
}
const repeated = (level: number, frames: number) => Array.from({ length: frames }, () => level)

describe('OnsetDetector', () => {
  it('tells the first frame that stands 10 dB above the floor, once', () => {
    expect(onsetsIn([...repeated(-80_000, 30), ...repeated(-70_000, 30)])).toEqual([30])
    expect(onsetsIn([...repeated(-80_000, 30), ...repeated(-76_001, 30)])).toEqual([])
  })

  it('tells nothing before it has a floor', () => {
    expect(onsetsIn([...repeated(-80_000, 5), ...repeated(-20_000, 30)])).toEqual([])
  })

  it('takes digital silence as the lowest floor', () => {
    expect(onsetsIn([...repeated(SILENCE_MDB, 30), -101_000, SILENCE_MDB, -99_000])).toEqual([32])
  })

  it('tells a string that is plucked again while it still rings', () => {
    const ringing = Array.from({ length: 100 }, (_, i) => -20_000 - i * 90)
    expect(onsetsIn([...repeated(-80_000, 30), ...ringing, ...repeated(-21_000, 10)])).toEqual([30, 131])
  })
})

import { describe, expect, it } from 'vitest'
import { shiftKeyAt } from '../../../server/workshop/shiftKeyAt.ts'

const shifts = [
  { name: 'late', from: '14:00' },
  { name: 'early', from: '06:00' },
  { name: 'night', from: '22:00' },
]
const london = { timeZone: 'Europe/London', shifts }
const key = (instant: string, clock = london) => shiftKeyAt(new Date(instant), clock)

describe('shiftKeyAt()', () => {
  it('changes at the minute at which a shift begins', () => {
    expect(key('2026-01-15T13:59:59Z')).toBe('2026-01-15 early')
    expect(key('2026-01-15T14:00:00Z')).toBe('2026-01-15 late')
  })

  it('counts the small hours to the shift that began the evening before', () => {
    expect(key('2026-01-15T23:30:00Z')).toBe('2026-01-15 night')
    expect(key('2026-01-16T05:59:00Z')).toBe('2026-01-15 night')
    expect(key('2026-01-01T00:30:00Z')).toBe('2025-12-31 night')
  })

  it('goes by the workshop’s own clocks, summer time included', () => {
    expect(key('2026-07-15T05:30:00Z')).toBe('2026-07-15 early')
    expect(key('2026-07-15T05:30:00Z', { timeZone: 'UTC', shifts })).toBe('2026-07-14 night')
    expect(key('2026-07-15T23:30:00Z', { timeZone: 'Asia/Tokyo', shifts })).toBe('2026-07-16 early')
  })

  it('keeps one key through the night in which the clocks change', () => {
    // 29 March 2026, 01:00 UTC: London's clocks go from 01:00 to 02:00.
    expect(key('2026-03-29T00:59:00Z')).toBe('2026-03-28 night')
    expect(key('2026-03-29T01:01:00Z')).toBe('2026-03-28 night')
    expect(key('2026-03-29T05:00:00Z')).toBe('2026-03-29 early')
  })

  it('makes the day one shift when a workshop has none', () => {
    expect(key('2026-01-15T23:30:00Z', { timeZone: 'UTC', shifts: [] })).toBe('2026-01-15 day')
  })
})

import { createHash } from 'node:crypto'
import fc from 'fast-check'
import { expect, test } from 'vitest'
import { TraceBuffer } from '../../../server/runs/traceBuffer.ts'
import { unpackSegment, unpackTrace } from '../../../server/runs/traceSegment.ts'
import type { BenchEvent, Frame } from '../../../src/shared/contract/frames.ts'
import { NOT_MEASURED_MDB, SILENCE_MDB } from '../../../src/shared/contract/quantities.ts'

const level = fc.oneof(
  fc.integer({ min: -300_000, max: 100_000 }),
  fc.constant(SILENCE_MDB),
  fc.constant(NOT_MEASURED_MDB),
)
const tri = fc.constantFrom(true, false, null)

function frames(channels: number): fc.Arbitrary<Frame[]> {
  const channel = fc.array(level, { minLength: channels, maxLength: channels })
  return fc.array(
    fc.record({
      levelMdb: channel,
      levelAMdb: channel,
      jackMdb: level,
      jackAMdb: level,
      clipped: fc.integer({ min: 0, max: 100_000 }),
      plugged: tri,
      ringSleeveClosed: tri,
      tipClosed: tri,
      currentUa: fc.option(fc.integer({ min: -1_000_000, max: 1_000_000 })),
      batteryMv: fc.option(fc.integer({ min: 0, max: 60_000 })),
    }),
    { minLength: 1, maxLength: 60 },
  )
}

function filled(channels: number, list: Frame[], events: BenchEvent[] = []): TraceBuffer {
  const buffer = new TraceBuffer(channels)
  list.forEach((frame, i) =>
    buffer.append(
      frame,
      events.filter((event) => event.frame === i),
    ),
  )
  return buffer
}

test('unpackSegment() gives back every frame that was packed, of one and of six channels', () => {
  for (const channels of [1, 6])
    fc.assert(
      fc.property(frames(channels), (list) => {
        const segment = filled(channels, list).pack(0, 0, list.length)
        expect(unpackSegment(segment).frames).toEqual(list)
      }),
      { seed: 20261201, numRuns: 100 },
    )
})

test('pack() keeps the events of its frames and leaves later ones', () => {
  const list = fc
    .sample(frames(6), { seed: 7, numRuns: 1 })[0]!
    .concat(fc.sample(frames(6), { seed: 8, numRuns: 1 })[0]!)
  const pedal = (frame: number): BenchEvent => ({
    kind: 'pedal',
    frame,
    startTenthMs: frame * 100,
    durationTenthMs: 0,
  })
  const buffer = filled(6, list, [pedal(0), pedal(list.length - 1)])
  const first = unpackSegment(buffer.pack(0, 0, list.length - 1))
  expect(first.events).toEqual([pedal(0)])
  buffer.drop(list.length - 1, list.length - 1)
  const second = unpackSegment(buffer.pack(1, list.length - 1, 1))
  expect(second.frames).toEqual(list.slice(-1))
  expect(second.events).toEqual([pedal(list.length - 1)])
})

test('the hash of a segment is the SHA-256 of its stored bytes, and a changed byte is refused', () => {
  const list = fc.sample(frames(1), { seed: 3, numRuns: 1 })[0]!
  const segment = filled(1, list).pack(4, 0, list.length)
  expect(segment.sha256.toString('hex')).toBe(createHash('sha256').update(segment.data).digest('hex'))
  const changed = Buffer.from(segment.data)
  changed[changed.length - 1] = changed[changed.length - 1]! ^ 1
  expect(() => unpackSegment({ ...segment, data: changed })).toThrow(/does not match its SHA-256/)
})

test('packing the same frames again gives the same bytes', () => {
  const list = fc.sample(frames(6), { seed: 11, numRuns: 1 })[0]!
  const buffer = filled(6, list)
  expect(buffer.pack(0, 0, list.length).data.equals(buffer.pack(0, 0, list.length).data)).toBe(true)
})

test('unpackTrace() joins segments in order and refuses a trace with a hole', () => {
  const list = fc.sample(frames(6), { seed: 5, numRuns: 1 })[0]!
  const buffer = filled(6, [...list, ...list, ...list])
  const n = list.length
  const first = buffer.pack(0, 0, n)
  buffer.drop(n, n)
  const second = buffer.pack(1, n, n)
  buffer.drop(n, 2 * n)
  const third = buffer.pack(2, 2 * n, n)
  expect(unpackTrace([first, second, third]).frames).toEqual([...list, ...list, ...list])
  expect(() => unpackTrace([first, third])).toThrow(/has no frame/)
})

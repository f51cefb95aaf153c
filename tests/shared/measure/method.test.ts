import { readdirSync, readFileSync } from 'node:fs'
import { describe, expect, it } from 'vitest'
import type { BenchEvent, Frame } from '../../../src/shared/contract/frames.ts'
import type { MeasuredRun } from '../../../src/shared/contract/measured.ts'
import type { RunAction, RunSetup } from '../../../src/shared/contract/runs.ts'
import { METHOD, methods } from '../../../src/shared/measure/method.ts'
import { replayRun } from '../../../src/shared/measure/replayRun.ts'
import { viewRun } from '../../../src/shared/measure/runState.ts'
import { unpackFrames, type PackedFrames } from '../../helpers/packedFrames.ts'
import { buildSetup } from '../../helpers/runSetup.ts'

interface Fixture {
  setup: RunSetup
  frames: PackedFrames
  events: BenchEvent[]
  actions: RunAction[]
  view: MeasuredRun
}

const folder = new URL('../../fixtures/method-1/', import.meta.url)
const fixtures = readdirSync(folder)
  .filter((name) => name.endsWith('.json'))
  .map((name) => [name, JSON.parse(readFileSync(new URL(name, folder), 'utf8')) as Fixture] as const)

const measure = ({ setup, events, actions }: Fixture, frames: Frame[]) =>
  viewRun(replayRun(setup, frames, events, actions))

/** Every number of a view with its place; numbers written in full, so that one bit shows. */
function numbersOf(value: unknown, place = ''): [string, number][] {
  if (typeof value === 'number') return [[place, value]]
  if (typeof value !== 'object' || value === null) return []
  return Object.entries(value).flatMap(([key, inner]) => numbersOf(inner, `${place}/${key}`))
}

describe('method 1', () => {
  it('is the present one, and is callable by its number', () => {
    expect(METHOD).toBe(1)
    expect(Object.keys(methods)).toContain('1')
    expect(fixtures.length).toBeGreaterThanOrEqual(4)
  })

  it.each(fixtures)('gives the frozen numbers of %s to the last bit', (_, fixture) => {
    const view = measure(fixture, unpackFrames(fixture.frames))
    // numbers first: they say where a difference is
    expect(numbersOf(view).map(([place, value]) => `${place} ${value}`)).toEqual(
      numbersOf(fixture.view).map(([place, value]) => `${place} ${value}`),
    )
    expect(JSON.parse(JSON.stringify(view))).toEqual(fixture.view)
  })

  it('shows a change of one thousandth of a dB in one frame of a kept pluck', () => {
    const [, fixture] = fixtures.find(([name]) => name === 'sound-six.json')!
    const frames = unpackFrames(fixture.frames)
    const pluck = fixture.view.plucks.find((one) => one.stringNo === 3 && one.dropped === null)!
    frames[pluck.onsetFrame + 10]!.levelMdb[2]! += 1
    const view = measure(fixture, frames)
    expect(view.strings[2]!.level.value).not.toBe(fixture.view.strings[2]!.level.value)
  })

  it('is refused under a number that is not known', () => {
    expect(() => replayRun({ ...buildSetup(), method: 999 }, [], [], [])).toThrow(RangeError)
  })
})

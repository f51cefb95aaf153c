import { expect, test } from 'vitest'
import { startRun, takeFrame, viewRun } from '../../../src/shared/measure/runState.ts'
import { buildSetup } from '../../helpers/runSetup.ts'
import { buildCheck } from '../../helpers/traceBuilder.ts'

test('the thump of a plug that comes back between strings is no pluck', () => {
  const setup = buildSetup()
  const { frames, events } = buildCheck({ setup })
  const state = startRun(setup)
  let frameNo = 0
  while (viewRun(state).phase !== 'strings') {
    const no = frameNo++
    takeFrame(
      state,
      frames[no]!,
      events.filter((event) => event.frame === no),
    )
  }
  const quiet = frames[frameNo - 1]!
  const thump = { ...quiet, levelMdb: quiet.levelMdb.map(() => -15_000) }
  const feed = (frame: typeof quiet, times: number) => {
    for (let i = 0; i < times; i++) takeFrame(state, frame, [])
  }
  feed(quiet, 50)
  feed({ ...quiet, plugged: false }, 40)
  feed({ ...thump, plugged: true }, 30)
  feed({ ...quiet, plugged: true }, 280)
  expect(viewRun(state).plucks).toEqual([])
  feed({ ...thump, plugged: true }, 60)
  feed({ ...quiet, plugged: true }, 100)
  expect(viewRun(state).plucks).toHaveLength(1)
})

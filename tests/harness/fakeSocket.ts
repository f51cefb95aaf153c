import { ref, shallowRef } from 'vue'
import type { BenchesHandlers, LiveState, RunHandlers } from '../../src/api/socket.ts'
import { bench, levelsAt, scene } from './scenes.ts'

const state = ref<LiveState>('connected')
const SECONDS_BEFORE = 10

/** Gives the scene's view, ten seconds of levels behind it, and then goes on at 20 updates a second. */
function watchRun(_run: string, handlers: RunHandlers): () => void {
  const { view } = scene
  if (!view) return () => undefined
  handlers.onView(view)
  const send = (frame: number) => {
    const levelMdb = levelsAt(view, frame)
    handlers.onLevels?.({
      run: view.id,
      frame,
      levelMdb,
      jackMdb: Math.max(...levelMdb),
      plugged: view.measured.jack.pluggedClosed !== null,
      ringSleeveClosed: view.measured.jack.pluggedClosed,
      tipClosed: view.measured.jack.tipSteady,
    })
  }
  const perSecond = 1000 / view.setup.frameMs
  const start = view.measured.frames
  for (let frame = start - SECONDS_BEFORE * perSecond; frame <= start; frame += perSecond / 20) send(frame)
  const last = view.measured.plucks.at(-1)
  if (view.status === 'open' && last && new URLSearchParams(location.search).has('pluck')) {
    handlers.onPluck?.({ run: view.id, stringNo: last.stringNo, pluck: last })
  }
  const isMoving = view.status === 'open' && new URLSearchParams(location.search).has('moving')
  let frame = start
  const timer = setInterval(() => isMoving && send((frame += perSecond / 20)), 50)
  return () => clearInterval(timer)
}

export const live = {
  state,
  lostAt: shallowRef<number | null>(null),
  connect: () => undefined,
  disconnect: () => undefined,
  watchRun,
  watchBenches(handlers: BenchesHandlers) {
    handlers.onBenches([bench])
    return () => undefined
  },
  onSessionEnded: () => () => undefined,
}

const lose = new URLSearchParams(location.search).get('lose')
if (lose) setTimeout(() => (state.value = 'reconnecting'), Number(lose))

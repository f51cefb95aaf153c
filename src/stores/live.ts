import { defineStore } from 'pinia'
import { computed, ref, shallowRef } from 'vue'
import { live } from '../api/socket.ts'
import type { ApiProblem } from '../api/apiProblem.ts'
import type { LiveLevels, LivePluck } from '../shared/contract/live.ts'
import type { Pluck } from '../shared/contract/measured.ts'
import type { RunView } from '../shared/contract/runs.ts'
import { createLevelRing, type LevelColumns } from './levelRing.ts'

/** The strip chart shows ten seconds; a little more is kept, so that its left edge is never empty. */
const KEPT_S = 11

export interface LastPluck {
  stringNo: number | null
  pluck: Pluck
  /** counts up, so that two alike are still two */
  count: number
}

/** The run that this screen watches: whole state, thinned levels, the last pluck. */
export const useLiveStore = defineStore('live', () => {
  const run = shallowRef<RunView | null>(null)
  const levels = shallowRef<LiveLevels | null>(null)
  /** counts the updates of `columns()`, which is changed in place */
  const levelUpdates = ref(0)
  const lastPluck = shallowRef<LastPluck | null>(null)
  const problem = shallowRef<ApiProblem | null>(null)
  const ring = createLevelRing(KEPT_S)
  let watchedRun: string | null = null
  let leave: (() => void) | null = null
  let plucks = 0

  const isConnected = computed(() => live.state.value === 'connected')

  function watch(id: string): void {
    if (watchedRun === id) return
    unwatch()
    watchedRun = id
    leave = live.watchRun(id, {
      onView: (view) => {
        run.value = view
        problem.value = null
      },
      onLevels: (message) => {
        if (!run.value) return
        ring.push(message, run.value.setup.frameMs)
        levels.value = message
        levelUpdates.value += 1
      },
      onPluck: (message: LivePluck) => {
        plucks += 1
        lastPluck.value = { stringNo: message.stringNo, pluck: message.pluck, count: plucks }
      },
      onProblem: (refused) => {
        problem.value = refused
      },
    })
  }

  function unwatch(): void {
    leave?.()
    leave = null
    watchedRun = null
    run.value = null
    levels.value = null
    lastPluck.value = null
    problem.value = null
    ring.clear()
    levelUpdates.value += 1
  }

  /** A view that came as the answer of a request: the socket may have brought a newer one meanwhile. */
  function accept(view: RunView): void {
    if (view.id !== watchedRun) return
    if (run.value && isOlder(view, run.value)) return
    run.value = view
  }

  return {
    run,
    levels,
    levelUpdates,
    lastPluck,
    problem,
    isConnected,
    connection: live.state,
    lostAt: live.lostAt,
    columns: (): LevelColumns => ring.columns(),
    watch,
    unwatch,
    accept,
  }
})

function isOlder(view: RunView, known: RunView): boolean {
  if (known.storage === 'stored' && view.storage !== 'stored') return true
  return view.measured.frames < known.measured.frames && view.actions.length <= known.actions.length
}

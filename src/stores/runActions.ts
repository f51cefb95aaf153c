import { defineStore } from 'pinia'
import { computed, shallowRef } from 'vue'
import { api } from '../api/http.ts'
import { newId } from '../api/newId.ts'
import { toApiProblem, type ApiProblem } from '../api/apiProblem.ts'
import type { RunActionBody, RunView } from '../shared/contract/runs.ts'
import { useLiveStore } from './live.ts'

/** Tries again after these times, then at the last of them for as long as it makes sense. */
const RETRY_MS = [300, 600, 1200, 2500]
/** A key meant for one step must not act on another: after this long it is dropped, and the person told. */
const KEY_LASTS_MS = 5000

export interface PendingAction {
  id: string
  action: RunActionBody
  tries: number
}

/**
 * What a person does during a run, over HTTP, one after the other in the order it was done. Each carries an id made
 * here, so that trying again after a lost answer never does it twice.
 */
export const useRunActionsStore = defineStore('runActions', () => {
  const live = useLiveStore()
  const queue = shallowRef<PendingAction[]>([])
  const refusal = shallowRef<{ problem: ApiProblem; action: RunActionBody } | null>(null)
  /** a key that was dropped because it could not be sent while it made sense */
  const expired = shallowRef<RunActionBody | null>(null)
  const isRetrying = computed(() => queue.value.some((pending) => pending.tries > 0))
  let last: Promise<unknown> = Promise.resolve()

  /** True once the server has stored it; false when it was refused or dropped. */
  async function act(runId: string, action: RunActionBody): Promise<boolean> {
    const pending: PendingAction = { id: newId(), action, tries: 0 }
    const step = stepOf(live.run)
    const since = performance.now()
    refusal.value = null
    expired.value = null
    queue.value = [...queue.value, pending]
    const mine = last.then(() => send(runId, pending, () => !isForOneStep(action) || isSameStep(step, since)))
    last = mine
    const done = await mine
    queue.value = queue.value.filter((other) => other.id !== pending.id)
    return done
  }

  async function send(runId: string, pending: PendingAction, stillMeant: () => boolean): Promise<boolean> {
    for (;;) {
      if (!stillMeant()) {
        expired.value = pending.action
        return false
      }
      try {
        const { id, action } = pending
        live.accept(await api('runs.act', { params: { id: runId }, body: { id, action } }))
        return true
      } catch (cause) {
        const problem = toApiProblem(cause)
        if (!isPassing(problem)) {
          refusal.value = { problem, action: pending.action }
          return false
        }
        const pause = RETRY_MS[Math.min(pending.tries, RETRY_MS.length - 1)]!
        pending.tries += 1
        queue.value = [...queue.value]
        await new Promise((resolve) => setTimeout(resolve, pause))
      }
    }
  }

  function isSameStep(step: string, since: number): boolean {
    return performance.now() - since < KEY_LASTS_MS && stepOf(live.run) === step
  }

  return { queue, refusal, expired, isRetrying, act }
})

function isForOneStep(action: RunActionBody): boolean {
  return action.kind === 'goOn' || action.kind === 'noSignal'
}

function stepOf(view: RunView | null): string {
  return view ? `${view.id} ${view.measured.phase} ${view.measured.promptStringNo}` : ''
}

/** Will pass by itself: no network, a server that restarts, a database that is away. */
function isPassing(problem: ApiProblem): boolean {
  return problem.code === 'client.offline' || problem.code === 'storage.away' || problem.status >= 500
}

import { defineStore } from 'pinia'
import { computed, ref, shallowRef } from 'vue'
import { z } from 'zod'
import { toApiProblem } from '../api/apiProblem.ts'
import type { ApiProblem } from '../api/apiProblem.ts'
import { api } from '../api/http.ts'
import { live } from '../api/socket.ts'
import type { BenchView, ModelView } from '../shared/contract/workshop.ts'
import { keep, readKept } from './storage.ts'

export type Readiness = 'ready' | 'notVerified' | 'offline' | 'notEnrolled'

export function readinessOf(bench: BenchView): Readiness {
  if (!bench.enrolled) return 'notEnrolled'
  if (!bench.connected) return 'offline'
  return bench.verified ? 'ready' : 'notVerified'
}

/** Benches, which of them this terminal stands at, and the models. */
export const useWorkshopStore = defineStore('workshop', () => {
  const benches = shallowRef<BenchView[]>([])
  const benchesKnown = ref(false)
  const models = shallowRef<ModelView[]>([])
  const problem = shallowRef<ApiProblem | null>(null)
  const benchId = ref<string | null>(readKept('bench', z.string()))
  const bench = computed(() => benches.value.find((one) => one.id === benchId.value) ?? null)
  let unwatch: (() => void) | null = null
  let loadingModels: Promise<ModelView[]> | null = null

  function take(list: BenchView[]): void {
    benches.value = list.toSorted((a, b) => a.name.localeCompare(b.name, 'en'))
    benchesKnown.value = true
    problem.value = null
    const usable = list.filter((one) => one.enrolled)
    // A workshop with one bench has nothing to choose.
    if (!bench.value && usable.length === 1) chooseBench(usable[0]!.id)
  }

  function takeOne(changed: BenchView): void {
    take([...benches.value.filter((one) => one.id !== changed.id), changed])
  }

  /** Follows the benches until the function it gives is called. */
  function watchBenches(): () => void {
    unwatch ??= live.watchBenches({
      onBenches: take,
      onBench: takeOne,
      onProblem: (why) => {
        problem.value = why
      },
    })
    return () => {
      unwatch?.()
      unwatch = null
    }
  }

  async function loadBenches(): Promise<void> {
    try {
      take((await api('benches.list')).items)
    } catch (cause) {
      problem.value = toApiProblem(cause)
    }
  }

  /** All models with the sheet in force; asked for once. */
  function loadModels(): Promise<ModelView[]> {
    loadingModels ??= api('models.list')
      .then((answer) => {
        models.value = answer.items
        return answer.items
      })
      .finally(() => {
        loadingModels = null
      })
    return models.value.length > 0 ? Promise.resolve(models.value) : loadingModels
  }

  function chooseBench(id: string): void {
    benchId.value = id
    keep('bench', id)
  }

  return {
    benches,
    benchesKnown,
    models,
    problem,
    benchId,
    bench,
    watchBenches,
    loadBenches,
    loadModels,
    chooseBench,
  }
})

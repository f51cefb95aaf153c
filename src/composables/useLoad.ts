import { onScopeDispose, ref, shallowRef, watch } from 'vue'
import type { Ref, ShallowRef } from 'vue'
import { isAbort, toApiProblem } from '../api/apiProblem.ts'
import type { ApiProblem } from '../api/apiProblem.ts'
import { useRetry } from './useRetry.ts'

export interface Loaded<T> {
  /** the last good answer; it stays while a newer one is being fetched */
  data: Readonly<ShallowRef<T | null>>
  problem: Readonly<ShallowRef<ApiProblem | null>>
  loading: Readonly<Ref<boolean>>
  reload: () => Promise<void>
}

/**
 * Fetches now and whenever the source changes; a newer request cancels the older one, whose late answer is dropped.
 * What is shown of one source is taken away when another is asked for.
 */
export function useLoad<S, T>(
  source: () => S,
  load: (source: S, signal: AbortSignal) => Promise<T>,
): Loaded<T> {
  const data = shallowRef<T | null>(null)
  const problem = shallowRef<ApiProblem | null>(null)
  const loading = ref(false)
  let running: AbortController | null = null

  async function reload(): Promise<void> {
    running?.abort()
    const mine = new AbortController()
    running = mine
    loading.value = true
    try {
      const answer = await load(source(), mine.signal)
      if (running !== mine) return
      data.value = answer
      problem.value = null
    } catch (cause) {
      if (running !== mine || isAbort(cause)) return
      problem.value = toApiProblem(cause)
    } finally {
      if (running === mine) loading.value = false
    }
  }

  useRetry(() => problem.value, reload)
  watch(
    source,
    () => {
      data.value = null
      problem.value = null
      void reload()
    },
    { immediate: true },
  )
  onScopeDispose(() => {
    running?.abort()
    running = null
  })
  return { data, problem, loading, reload }
}

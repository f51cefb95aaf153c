import { onScopeDispose, watch } from 'vue'
import type { ApiProblem } from '../api/apiProblem.ts'

/** Problems that pass by themselves: the page asks again without being told. */
const PASSING = new Set<string>(['client.offline', 'storage.away'])
export const RETRY_AFTER_MS = 3000

/** Asks again a few seconds after each problem that can pass by itself, as long as the component lives. */
export function useRetry(problem: () => ApiProblem | null, again: () => Promise<unknown>): void {
  let timer: ReturnType<typeof setTimeout> | undefined
  watch(
    problem,
    (now) => {
      clearTimeout(timer)
      if (now && PASSING.has(now.code)) timer = setTimeout(() => void again(), RETRY_AFTER_MS)
    },
    { immediate: true },
  )
  onScopeDispose(() => clearTimeout(timer))
}

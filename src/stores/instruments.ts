import { defineStore } from 'pinia'
import { ref, shallowRef } from 'vue'
import { isAbort, toApiProblem } from '../api/apiProblem.ts'
import type { ApiProblem } from '../api/apiProblem.ts'
import { api } from '../api/http.ts'
import type { InstrumentSummary, InstrumentView } from '../shared/contract/workshop.ts'

export const useInstrumentsStore = defineStore('instruments', () => {
  const items = shallowRef<InstrumentSummary[]>([])
  /** keyset of the next page; null: there is none */
  const next = ref<string | null>(null)
  const search = ref('')
  const loading = ref(false)
  /** false until the first answer to the present search */
  const known = ref(false)
  const problem = shallowRef<ApiProblem | null>(null)
  let running: AbortController | null = null
  let asked: string | null = null

  async function fetchPage(after: string | null): Promise<void> {
    running?.abort()
    asked = after
    const mine = new AbortController()
    running = mine
    loading.value = true
    try {
      const page = await api(
        'instruments.list',
        { query: { search: search.value.trim() || undefined, after: after ?? undefined } },
        { signal: mine.signal },
      )
      if (running !== mine) return
      items.value = after === null ? page.items : [...items.value, ...page.items]
      next.value = page.next
      problem.value = null
      known.value = true
    } catch (cause) {
      if (running !== mine || isAbort(cause)) return
      problem.value = toApiProblem(cause)
    } finally {
      if (running === mine) loading.value = false
    }
  }

  /** First page of a search. What was found before stays until the answer is here. */
  function load(text = search.value): Promise<void> {
    search.value = text
    return fetchPage(null)
  }

  function more(): Promise<void> {
    return next.value === null ? Promise.resolve() : fetchPage(next.value)
  }

  /** The page that was asked for last, once more. */
  function again(): Promise<void> {
    return fetchPage(asked)
  }

  function read(serial: string, signal?: AbortSignal): Promise<InstrumentView> {
    return api('instruments.read', { params: { serial } }, { signal })
  }

  return { items, next, search, loading, known, problem, load, more, again, read }
})

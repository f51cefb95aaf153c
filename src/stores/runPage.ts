import { defineStore } from 'pinia'
import { api } from '../api/http.ts'
import type { RecomputeReport, RunTrace, RunView } from '../shared/contract/runs.ts'

/** Points of a trace: more than a wide screen has columns, few enough to draw at once. */
const TRACE_POINTS = 3000

/** What the page of one run asks the server. */
export const useRunPageStore = defineStore('runPage', () => ({
  read: (id: string, signal?: AbortSignal): Promise<RunView> =>
    api('runs.read', { params: { id } }, { signal }),
  trace: (id: string, signal?: AbortSignal): Promise<RunTrace> =>
    api('runs.trace', { params: { id }, query: { points: TRACE_POINTS } }, { signal }),
  recompute: (id: string): Promise<RecomputeReport> => api('runs.recompute', { params: { id } }),
}))

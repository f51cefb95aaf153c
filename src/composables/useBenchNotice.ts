import { computed, onScopeDispose, shallowRef, watch, type ComputedRef, type Ref } from 'vue'
import type { LastPluck } from '../stores/live.ts'
import { DROP_REASONS } from '../texts.ts'

export interface BenchNotice {
  text: string
  tone: 'quiet' | 'attention'
  /** the answer to something that the person just did, so that it goes before all else */
  isAnswer?: boolean
}

/** How long a line stands before the hint comes back. */
export const NOTICE_MS = 6000

export interface PluckCount {
  accepted: number
  wanted: number
}

/** 'String 4 dropped. Another string still rang. Damp all first.', or 'String 4 heard, 2 of 3.' */
export function pluckNotice(
  { stringNo, pluck }: LastPluck,
  word: 'String' | 'Course',
  countOf: (stringNo: number) => PluckCount | null,
): BenchNotice {
  const who = stringNo === null ? 'Pluck' : `${word} ${stringNo}`
  if (pluck.dropped) return { text: `${who} dropped. ${DROP_REASONS[pluck.dropped]}`, tone: 'attention' }
  const count = stringNo === null ? null : countOf(stringNo)
  const of = count ? `, ${Math.min(count.accepted, count.wanted)} of ${count.wanted}` : ''
  return { text: `${who} heard${of}.`, tone: 'quiet' }
}

/** One short line that stands for some seconds; the newest one wins. */
export function useBenchNotice(
  lastPluck: Readonly<Ref<LastPluck | null>>,
  word: () => 'String' | 'Course',
  countOf: (stringNo: number) => PluckCount | null,
): { notice: ComputedRef<BenchNotice | null>; say: (text: string) => void } {
  /** a pluck's line is made when it is read: the count behind it may come a moment later */
  const shown = shallowRef<LastPluck | string | null>(null)
  let timer: ReturnType<typeof setTimeout> | undefined
  const notice = computed<BenchNotice | null>(() => {
    if (shown.value === null) return null
    if (typeof shown.value === 'string') return { text: shown.value, tone: 'attention', isAnswer: true }
    return pluckNotice(shown.value, word(), countOf)
  })

  function show(next: LastPluck | string): void {
    shown.value = next
    clearTimeout(timer)
    timer = setTimeout(() => {
      shown.value = null
    }, NOTICE_MS)
  }

  watch(
    () => lastPluck.value?.count,
    () => {
      if (lastPluck.value) show(lastPluck.value)
    },
  )
  onScopeDispose(() => clearTimeout(timer))
  return { notice, say: show }
}

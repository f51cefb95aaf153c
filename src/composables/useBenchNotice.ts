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

/** Where the run stands: a line said for one step does not outlast it. */
export interface BenchStep {
  phase: string
  stringNo: number | null
}

interface Answer extends BenchNotice {
  /** it speaks of this string, and stands on when that one is asked for next */
  stringNo?: number | null
}

/** 'String 4 dropped. Another string still rang. Damp all first.', or 'String 4 heard, 2 of 3.' */
export function pluckNotice(
  { stringNo, pluck }: LastPluck,
  word: 'String' | 'Course',
  countOf: (stringNo: number) => PluckCount | null,
): BenchNotice {
  const who = stringNo === null ? 'Pluck' : `${word} ${stringNo}`
  if (pluck.dropped === 'stringDone')
    return { text: `${who} was done already. Nothing changes.`, tone: 'quiet' }
  if (pluck.dropped) return { text: `${who} dropped. ${DROP_REASONS[pluck.dropped]}`, tone: 'attention' }
  const count = stringNo === null ? null : countOf(stringNo)
  const of =
    count && count.accepted > 0 ? `, ${Math.min(count.accepted, count.wanted)} of ${count.wanted}` : ''
  return { text: `${who} heard${of}.`, tone: 'quiet' }
}

/** One short line that stands for some seconds, and not longer than the step it was said in; the newest one wins. */
export function useBenchNotice(
  lastPluck: Readonly<Ref<LastPluck | null>>,
  word: () => 'String' | 'Course',
  countOf: (stringNo: number) => PluckCount | null,
  step: () => BenchStep,
): {
  notice: ComputedRef<BenchNotice | null>
  say: (text: string, options?: { tone?: BenchNotice['tone']; stringNo?: number | null }) => void
} {
  /** a pluck's line is made when it is read: the count behind it may come a moment later */
  const shown = shallowRef<LastPluck | Answer | null>(null)
  let timer: ReturnType<typeof setTimeout> | undefined
  const notice = computed<BenchNotice | null>(() => {
    if (shown.value === null) return null
    if ('pluck' in shown.value) return pluckNotice(shown.value, word(), countOf)
    const { text, tone, isAnswer } = shown.value
    return { text, tone, isAnswer }
  })

  function show(next: LastPluck | Answer): void {
    shown.value = next
    clearTimeout(timer)
    timer = setTimeout(clear, NOTICE_MS)
  }
  function clear(): void {
    clearTimeout(timer)
    shown.value = null
  }

  watch(
    () => lastPluck.value?.count,
    () => {
      if (lastPluck.value) show(lastPluck.value)
    },
  )
  // At once, so that what is said in answer to the change is said after it.
  watch(
    () => `${step().phase} ${step().stringNo}`,
    () => {
      const now = shown.value
      const isOfThisString =
        now !== null && 'text' in now && now.stringNo != null && now.stringNo === step().stringNo
      if (!isOfThisString) clear()
    },
    { flush: 'sync' },
  )
  onScopeDispose(() => clearTimeout(timer))
  return {
    notice,
    say: (text, { tone = 'attention', stringNo = null } = {}) =>
      show({ text, tone, isAnswer: true, stringNo }),
  }
}

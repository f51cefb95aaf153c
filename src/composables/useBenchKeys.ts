import { onScopeDispose, ref, toValue, type MaybeRefOrGetter, type Ref } from 'vue'

/** A key is a command only when no other key came this long before it or follows this long after it. */
export const QUIET_MS = 80
/** How long Escape is held to stop a run. */
export const HOLD_MS = 1000

export interface BenchKeyActions {
  /** Space, or a foot switch that types it */
  goOn: () => void
  /** R */
  repeat: () => void
  /** Escape held for HOLD_MS */
  stop: () => void
  /** Escape pressed and let go before that */
  cancel?: () => void
  /** 1 to 9, for a short list of reasons */
  digit?: (digit: number) => void
  /** false: every key is left to the page */
  enabled: MaybeRefOrGetter<boolean>
}

const MODIFIERS = new Set(['Shift', 'CapsLock', 'Control', 'Alt', 'AltGraph', 'Meta', 'NumLock'])
const BUTTON_LIKE = 'button, summary, [role="button"], [role="radio"], [role="tab"], [role="switch"]'
const FIELD = 'input, textarea, select, [contenteditable=""], [contenteditable="true"], [role="combobox"]'

export type BenchKey = 'goOn' | 'repeat' | 'escape' | number

/**
 * What a key means at the bench. The printed letter counts where the layout has Latin letters (so R is R on every
 * such layout); elsewhere the key's place does, and digits are found where a layout needs Shift for them.
 */
export function benchKeyOf(event: Pick<KeyboardEvent, 'key' | 'code'>): BenchKey | null {
  const { key, code } = event
  if (key === ' ' || key === 'Spacebar' || code === 'Space') return 'goOn'
  if (key === 'Escape' || key === 'Esc') return 'escape'
  if (/^[1-9]$/.test(key)) return Number(key)
  if (/^[a-z]$/i.test(key)) return key.toLowerCase() === 'r' ? 'repeat' : null
  const digit = /^(?:Digit|Numpad)([1-9])$/.exec(code)
  if (digit) return Number(digit[1])
  return code === 'KeyR' ? 'repeat' : null
}

/** True while the keys belong to a field that is being filled in. */
export function isTypingIn(target: EventTarget | null): boolean {
  if (!(target instanceof Element)) return false
  const field = target.closest(FIELD)
  if (!field) return false
  const type = field instanceof HTMLInputElement ? field.type : 'text'
  return !['checkbox', 'radio', 'button', 'submit', 'reset', 'range'].includes(type)
}

function pressesByItself(target: EventTarget | null): boolean {
  return (
    target instanceof Element &&
    (target.closest(BUTTON_LIKE) !== null ||
      (target instanceof HTMLInputElement && ['checkbox', 'radio', 'button', 'submit'].includes(target.type)))
  )
}

/**
 * Space, R, digits and held Escape as commands at the bench. A scanner types a serial as one burst of keys, so a
 * key acts only when it stands alone; nothing acts while a field is being filled in.
 */
export function useBenchKeys(
  actions: BenchKeyActions,
  target: EventTarget = window,
  /** when the key went down: the event's own time, so that a busy page does not tear a scan apart */
  timeOf: (event: KeyboardEvent) => number = (event) => event.timeStamp,
): { holdProgress: Ref<number> } {
  const holdProgress = ref(0)
  let pending: ReturnType<typeof setTimeout> | undefined
  let lastKeyAt = Number.NEGATIVE_INFINITY
  let heldSince: number | null = null
  let tick: ReturnType<typeof setInterval> | undefined

  const dropPending = () => {
    clearTimeout(pending)
    pending = undefined
  }

  const endHold = () => {
    clearInterval(tick)
    tick = undefined
    heldSince = null
    holdProgress.value = 0
  }

  const beginHold = () => {
    heldSince = performance.now()
    tick = setInterval(() => {
      if (heldSince === null) return
      holdProgress.value = Math.min(1, (performance.now() - heldSince) / HOLD_MS)
      if (holdProgress.value < 1) return
      endHold()
      if (toValue(actions.enabled)) actions.stop()
    }, 40)
  }

  const act = (key: BenchKey) => {
    if (!toValue(actions.enabled)) return
    if (key === 'goOn') actions.goOn()
    else if (key === 'repeat') actions.repeat()
    else if (typeof key === 'number') actions.digit?.(key)
  }

  const onKeyDown = (event: Event) => {
    if (!(event instanceof KeyboardEvent)) return
    const at = timeOf(event)
    const isOnItsOwn = at - lastKeyAt >= QUIET_MS
    dropPending()
    if (MODIFIERS.has(event.key)) {
      // A scanner sends Shift before a capital: inside a burst it goes on, by itself it begins none.
      if (!isOnItsOwn) lastKeyAt = at
      if (heldSince !== null) endHold()
      return
    }
    const key = benchKeyOf(event)
    if (event.repeat) {
      if (key === 'goOn' && !isTypingIn(event.target) && toValue(actions.enabled)) event.preventDefault()
      return
    }
    lastKeyAt = at
    if (heldSince !== null) endHold()
    if (!toValue(actions.enabled) || key === null || event.isComposing) return
    if (event.ctrlKey || event.altKey || event.metaKey || isTypingIn(event.target)) return
    if (key === 'goOn' && pressesByItself(event.target)) return
    // Space would scroll the page.
    if (key === 'goOn') event.preventDefault()
    if (!isOnItsOwn) return
    if (key === 'escape') beginHold()
    else pending = setTimeout(() => act(key), QUIET_MS)
  }

  const onKeyUp = (event: Event) => {
    if (!(event instanceof KeyboardEvent) || benchKeyOf(event) !== 'escape' || heldSince === null) return
    endHold()
    actions.cancel?.()
  }

  const onBlur = () => {
    dropPending()
    endHold()
  }

  target.addEventListener('keydown', onKeyDown)
  target.addEventListener('keyup', onKeyUp)
  window.addEventListener('blur', onBlur)
  onScopeDispose(() => {
    onBlur()
    target.removeEventListener('keydown', onKeyDown)
    target.removeEventListener('keyup', onKeyUp)
    window.removeEventListener('blur', onBlur)
  })
  return { holdProgress }
}

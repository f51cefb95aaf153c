import { onScopeDispose } from 'vue'

/** Keys of a scanner follow one another faster than a hand can type. */
export const BURST_GAP_MS = 50
/** On average they are faster still; two keys rolled under one hand are not a scan. */
export const BURST_MEAN_GAP_MS = 35
export const BURST_MIN_CHARACTERS = 4
/** Enter may come a little later than the characters. */
const ENTER_GAP_MS = 120

export interface ScannerOptions {
  /** what was scanned, as it was sent, without the closing Enter */
  onScan: (code: string) => void
  target?: EventTarget
  /** when the key went down: the event's own time, so that a busy page does not turn typing into a scan */
  timeOf?: (event: KeyboardEvent) => number
}

const SILENT_KEYS = new Set(['Shift', 'CapsLock', 'NumLock', 'AltGraph'])

type Field = HTMLInputElement | HTMLTextAreaElement

interface Burst {
  characters: string
  startedAt: number
  lastAt: number
  /** the field that the characters fall into, and what it held before */
  field: Field | null
  fieldValue: string
}

/**
 * Takes a burst of keys that ends with Enter as a scan, wherever the focus is. Events are never stopped: whoever
 * listens for single keys must see that more of them follow. Characters that fell into a field are taken out again.
 */
export function useScanner(options: ScannerOptions): void {
  const target = options.target ?? window
  const timeOf = options.timeOf ?? ((event: KeyboardEvent) => event.timeStamp)
  let burst: Burst | null = null

  const onKeyDown = (event: Event) => {
    if (!(event instanceof KeyboardEvent) || SILENT_KEYS.has(event.key)) return
    const at = timeOf(event)
    if (event.ctrlKey || event.altKey || event.metaKey || event.isComposing || event.repeat) {
      burst = null
      return
    }
    if (event.key === 'Enter') {
      const ended = burst
      burst = null
      if (!ended || !isScan(ended, at)) return
      // Enter would send the form or press the button that has the focus.
      event.preventDefault()
      restore(ended)
      options.onScan(ended.characters.trim())
      return
    }
    if ([...event.key].length !== 1) {
      burst = null
      return
    }
    if (burst && at - burst.lastAt <= BURST_GAP_MS) {
      burst.characters += event.key
      burst.lastAt = at
    } else {
      const field = fieldOf(event.target)
      burst = { characters: event.key, startedAt: at, lastAt: at, field, fieldValue: field?.value ?? '' }
    }
    // Space within a burst would press the button that has the focus, or scroll.
    if (event.key === ' ' && burst.characters.length > 1 && !burst.field) event.preventDefault()
  }

  target.addEventListener('keydown', onKeyDown, { capture: true })
  onScopeDispose(() => target.removeEventListener('keydown', onKeyDown, { capture: true }))
}

function isScan(burst: Burst, enterAt: number): boolean {
  const gaps = burst.characters.length - 1
  return (
    burst.characters.trim().length >= BURST_MIN_CHARACTERS &&
    enterAt - burst.lastAt <= ENTER_GAP_MS &&
    (burst.lastAt - burst.startedAt) / gaps <= BURST_MEAN_GAP_MS
  )
}

function fieldOf(target: EventTarget | null): Field | null {
  return target instanceof HTMLInputElement || target instanceof HTMLTextAreaElement ? target : null
}

function restore(burst: Burst): void {
  if (!burst.field || burst.field.value === burst.fieldValue) return
  burst.field.value = burst.fieldValue
  burst.field.dispatchEvent(new Event('input', { bubbles: true }))
}

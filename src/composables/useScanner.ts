import { onScopeDispose } from 'vue'

/** On average the keys of a scanner follow one another faster than a hand can type. */
export const BURST_MEAN_GAP_MS = 35
/**
 * A single gap may be longer: cutting a scan in two at a hiccup would make a shorter, wrong serial of it. What stands
 * close before a scan therefore belongs to it, and then the code is refused rather than misread.
 */
export const BURST_LONGEST_GAP_MS = 300
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
  /** fields that characters fell into, and what each held before */
  fields: Map<Field, string>
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
    if (!burst || at - burst.lastAt > BURST_LONGEST_GAP_MS) {
      burst = { characters: '', startedAt: at, lastAt: at, fields: new Map() }
    }
    const field = fieldOf(event.target)
    // The focus may move while a scan comes in.
    if (field && !burst.fields.has(field)) burst.fields.set(field, field.value)
    burst.characters += event.key
    burst.lastAt = at
    // Space within a burst would press the button that has the focus, or scroll.
    if (event.key === ' ' && burst.characters.length > 1 && !field) event.preventDefault()
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
  for (const [field, before] of burst.fields) {
    if (field.value === before) continue
    field.value = before
    field.dispatchEvent(new Event('input', { bubbles: true }))
  }
}

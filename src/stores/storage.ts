import type { z } from 'zod'

/** on this terminal for good, or for as long as its tab is open */
export type Keeper = 'terminal' | 'tab'
const storageOf = (keeper: Keeper) => (keeper === 'tab' ? sessionStorage : localStorage)

/** Keeps a small value on this terminal. What was kept by another version and no longer fits is left out. */
export function readKept<T>(key: string, schema: z.ZodType<T>, keeper: Keeper = 'terminal'): T | null {
  try {
    const text = storageOf(keeper).getItem(`evenstrung.${key}`)
    if (text === null) return null
    const parsed = schema.safeParse(JSON.parse(text))
    return parsed.success ? parsed.data : null
  } catch {
    // A browser that keeps nothing: the terminal then starts afresh each time.
    return null
  }
}

export function keep(key: string, value: unknown, keeper: Keeper = 'terminal'): void {
  try {
    if (value === null) storageOf(keeper).removeItem(`evenstrung.${key}`)
    else storageOf(keeper).setItem(`evenstrung.${key}`, JSON.stringify(value))
  } catch {
    // As above: the choice holds until the page is closed.
  }
}

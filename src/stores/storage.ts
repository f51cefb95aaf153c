import type { z } from 'zod'

/** Keeps a small value on this terminal. What was kept by another version and no longer fits is left out. */
export function readKept<T>(key: string, schema: z.ZodType<T>): T | null {
  try {
    const text = localStorage.getItem(`evenstrung.${key}`)
    if (text === null) return null
    const parsed = schema.safeParse(JSON.parse(text))
    return parsed.success ? parsed.data : null
  } catch {
    // A browser that keeps nothing: the terminal then starts afresh each time.
    return null
  }
}

export function keep(key: string, value: unknown): void {
  try {
    if (value === null) localStorage.removeItem(`evenstrung.${key}`)
    else localStorage.setItem(`evenstrung.${key}`, JSON.stringify(value))
  } catch {
    // As above: the choice holds until the page is closed.
  }
}

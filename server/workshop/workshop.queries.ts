import type { Knex } from 'knex'
import { z } from 'zod'
import { fromJson } from '../runs/runs.queries.ts'

/** A shift lasts until the next one of the day begins; the last one reaches into the next morning. */
export const Shift = z.object({
  name: z.string().min(1).max(28),
  /** local time of day, 'HH:MM' */
  from: z.string().regex(/^([01]\d|2[0-3]):[0-5]\d$/),
})
export type Shift = z.infer<typeof Shift>

export interface WorkshopClock {
  timeZone: string
  shifts: Shift[]
}

interface RawWorkshop {
  name: string
  time_zone: string
  shifts: unknown
}

/** Common practice of three shifts, no source; holds until the workshop has settings of its own. */
export const DEFAULT_SHIFTS: readonly Shift[] = [
  { name: 'early', from: '06:00' },
  { name: 'late', from: '14:00' },
  { name: 'night', from: '22:00' },
]

/** Name for screens and the clock of the workshop, from its settings or, before there are any, from the defaults. */
export async function findWorkshop(
  knex: Knex,
  fallbackTimeZone: string,
): Promise<WorkshopClock & { name: string }> {
  const row = await knex('workshop_settings').first<RawWorkshop | undefined>('name', 'time_zone', 'shifts')
  if (!row) return { name: 'Workshop', timeZone: fallbackTimeZone, shifts: [...DEFAULT_SHIFTS] }
  return { name: row.name, timeZone: row.time_zone, shifts: z.array(Shift).parse(fromJson(row.shifts)) }
}

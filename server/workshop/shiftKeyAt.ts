import type { WorkshopClock } from './workshop.queries.ts'

const DAY_MS = 86_400_000

/** Date and time of day on the workshop's own clocks. */
function localTime(instant: Date, timeZone: string): { day: number; time: string } {
  const format = new Intl.DateTimeFormat('en-GB', {
    timeZone,
    year: 'numeric',
    month: '2-digit',
    day: '2-digit',
    hour: '2-digit',
    minute: '2-digit',
    hourCycle: 'h23',
  })
  const part = Object.fromEntries(format.formatToParts(instant).map(({ type, value }) => [type, value]))
  // A calendar day as if it were UTC, so that 'the day before' needs no time zone.
  const day = Date.UTC(Number(part.year), Number(part.month) - 1, Number(part.day))
  return { day, time: `${part.hour}:${part.minute}` }
}

/**
 * Name of the shift that an instant falls in: the local date on which it began, and its name. Before the first shift
 * of a day it is still the last one of the day before. Without shifts the day is one.
 */
export function shiftKeyAt(instant: Date, { timeZone, shifts }: WorkshopClock): string {
  const { day, time } = localTime(instant, timeZone)
  const inOrder = shifts.toSorted((a, b) => (a.from < b.from ? -1 : 1))
  const begun = inOrder.findLast(({ from }) => from <= time)
  const shift = begun ?? inOrder.at(-1) ?? { name: 'day' }
  const startDay = begun || inOrder.length === 0 ? day : day - DAY_MS
  return `${new Date(startDay).toISOString().slice(0, 10)} ${shift.name}`
}

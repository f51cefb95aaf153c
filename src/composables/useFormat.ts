import {
  formatDateTime,
  formatLevel,
  formatLevelMdb,
  formatReading,
  formatTime,
  formatTimeOrDate,
  formatValue,
} from '../format.ts'
import type { Reading, Unit } from '../shared/contract/quantities.ts'
import { usePreferencesStore } from '../stores/preferences.ts'
import { useSessionStore } from '../stores/session.ts'

type Instantish = string | number | Date | null | undefined

/** The formats that depend on the workshop's time zone or on the level unit that the person chose. */
export function useFormat() {
  const session = useSessionStore()
  const preferences = usePreferencesStore()
  return {
    dateTime: (instant: Instantish) => formatDateTime(instant, session.timeZone),
    time: (instant: Instantish) => formatTime(instant, session.timeZone),
    timeOrDate: (instant: Instantish) => formatTimeOrDate(instant, Date.now(), session.timeZone),
    level: (levelDb: number | null | undefined) => formatLevel(levelDb, preferences.levelUnit),
    levelMdb: (levelMdb: number | null | undefined) => formatLevelMdb(levelMdb, preferences.levelUnit),
    value: (value: number | null | undefined, unit: Unit, signed = false) =>
      formatValue(value, unit, { signed, level: preferences.levelUnit }),
    reading: (reading: Pick<Reading, 'value' | 'atMost' | 'unit'>, signed = false) =>
      formatReading(reading, { signed, level: preferences.levelUnit }),
  }
}

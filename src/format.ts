import { NOT_MEASURED_MDB, SILENCE_MDB } from './shared/contract/quantities.ts'
import type { Reading, Unit } from './shared/contract/quantities.ts'

/** The one place where numbers, units and dates become text. */

export type LevelUnit = 'dBV' | 'dBu'

export const MINUS = '\u2212'
/** Shown where there is no reading. */
export const NO_VALUE = '\u2014'
export const AT_MOST = '\u2264'

/** dBu is re the voltage of 1 mW in 600 ohm, sqrt(0.6) V = 0.7746 V: the same level reads 2.22 dB higher. */
const DBU_ABOVE_DBV_DB = -20 * Math.log10(Math.sqrt(0.6))

type Value = number | null | undefined

/** A number with a fixed count of decimals and a true minus sign; never '-0.0'. */
export function formatNumber(value: Value, decimals = 1): string {
  if (value == null || !Number.isFinite(value)) return NO_VALUE
  const text = value.toFixed(decimals)
  if (Number(text) === 0) return text.replace('-', '')
  return text.replace('-', MINUS)
}

/** As formatNumber, with '+' before what is above zero. */
export function formatSigned(value: Value, decimals = 1): string {
  const text = formatNumber(value, decimals)
  return value != null && Number.isFinite(value) && Number(value.toFixed(decimals)) > 0 ? `+${text}` : text
}

function withUnit(text: string, unit: string): string {
  return text === NO_VALUE ? text : `${text} ${unit}`
}

/** A level given in dBV as a number of the unit that the person chose. */
export function levelIn(levelDb: number, unit: LevelUnit): number {
  return unit === 'dBu' ? levelDb + DBU_ABOVE_DBV_DB : levelDb
}

/** A level given in dBV, in the unit that the person chose: '−21.9 dBV'. */
export function formatLevel(levelDb: Value, unit: LevelUnit = 'dBV', decimals = 1): string {
  const shown = levelDb == null ? levelDb : levelIn(levelDb, unit)
  return withUnit(formatNumber(shown, decimals), unit)
}

/** A level as it travels, in thousandths of a dB re 1 V. */
export function formatLevelMdb(levelMdb: Value, unit: LevelUnit = 'dBV'): string {
  if (levelMdb === SILENCE_MDB) return 'silence'
  return formatLevel(levelMdb == null || levelMdb === NOT_MEASURED_MDB ? null : levelMdb / 1000, unit)
}

/** A difference that has a direction: '+0.4 dB'. */
export function formatBalance(balanceDb: Value, decimals = 1): string {
  return withUnit(formatSigned(balanceDb, decimals), 'dB')
}

/** A ratio or a spread without a direction: '66.7 dB'. */
export function formatDb(value: Value, decimals = 1): string {
  return withUnit(formatNumber(value, decimals), 'dB')
}

/** Expanded uncertainty, without a unit: '±0.7'. */
export function formatU(expandedU: Value, decimals = 1): string {
  const text = formatNumber(expandedU, decimals)
  return text === NO_VALUE ? text : `\u00b1${text}`
}

/** Ohm; below 1 ohm in whole milliohm, below 10 milliohm with one decimal. */
export function formatOhm(ohm: Value): string {
  if (ohm == null || !Number.isFinite(ohm)) return NO_VALUE
  const size = Math.abs(ohm)
  if (size < 0.00995) return `${formatNumber(ohm * 1000, 1)} m\u03a9`
  if (size < 0.9995) return `${formatNumber(ohm * 1000, 0)} m\u03a9`
  if (size < 9995) return `${formatNumber(ohm, 2)} \u03a9`
  return `${formatNumber(ohm / 1000, 1)} k\u03a9`
}

export function formatMohm(megaohm: Value): string {
  return withUnit(formatNumber(megaohm, megaohm != null && megaohm >= 100 ? 0 : 1), 'M\u03a9')
}

export function formatMa(milliampere: Value): string {
  return withUnit(formatNumber(milliampere, 2), 'mA')
}

/** From a milliampere on in mA. */
export function formatUa(microampere: Value): string {
  if (microampere != null && Math.abs(microampere) >= 999.995) return formatMa(microampere / 1000)
  return withUnit(formatNumber(microampere, 2), '\u00b5A')
}

export function formatVolt(volt: Value): string {
  return withUnit(formatNumber(volt, 2), 'V')
}

export function formatMs(durationMs: Value): string {
  return withUnit(formatNumber(durationMs, 1), 'ms')
}

export function formatHz(hertz: Value): string {
  return withUnit(formatNumber(hertz, 1), 'Hz')
}

export function formatCount(count: Value): string {
  return formatNumber(count, 0)
}

/** A share of one as a percentage. A near miss is not rounded up to certainty: 0.9996 gives '> 99.9 %'. */
export function formatShare(share: Value): string {
  if (share == null || !Number.isFinite(share)) return NO_VALUE
  const percent = share * 100
  if (percent < 100 && percent > 99.9) return '> 99.9 %'
  if (percent > 0 && percent < 0.1) return '< 0.1 %'
  return `${formatNumber(percent, percent > 90 && percent < 100 ? 1 : 0)} %`
}

/** A value in the unit of its rule. `signed` is for differences that have a direction, such as a balance. */
export function formatValue(
  value: Value,
  unit: Unit,
  options: { signed?: boolean; level?: LevelUnit } = {},
): string {
  switch (unit) {
    case 'dB':
      return options.signed ? formatBalance(value) : formatDb(value)
    case 'dBV':
      return formatLevel(value, options.level)
    case 'ohm':
      return formatOhm(value)
    case 'Mohm':
      return formatMohm(value)
    case 'mA':
      return formatMa(value)
    case 'uA':
      return formatUa(value)
    case 'V':
      return formatVolt(value)
    case 'ms':
      return formatMs(value)
    case 'count':
      return formatCount(value)
    case 'yes/no':
      return value == null || !Number.isFinite(value) ? NO_VALUE : value >= 0.5 ? 'yes' : 'no'
  }
}

/** A reading, or '≤ X' when it is censored. */
export function formatReading(
  reading: Pick<Reading, 'value' | 'atMost' | 'unit'>,
  options: { signed?: boolean; level?: LevelUnit } = {},
): string {
  const text = formatValue(reading.value, reading.unit, options)
  return reading.atMost && text !== NO_VALUE ? `${AT_MOST} ${text}` : text
}

/** Distance to a limit; shown finer near zero, so that outside never reads as 'exactly at the limit'. */
export function formatMargin(margin: Value, unit: Unit): string {
  if (margin == null || !Number.isFinite(margin)) return NO_VALUE
  if (unit === 'dB' || unit === 'dBV') {
    return withUnit(formatSigned(margin, margin !== 0 && Math.abs(margin) < 0.1 ? 3 : 1), 'dB')
  }
  const text = formatValue(margin, unit)
  return margin > 0 ? `+${text}` : text
}

/** '−2.5 to +2.5 dB', 'at least 8.00 V', 'at most 3'. */
export function formatLimits(
  low: Value,
  high: Value,
  unit: Unit,
  options: { signed?: boolean; level?: LevelUnit } = {},
): string {
  const lowText = formatValue(low, unit, options)
  const highText = formatValue(high, unit, options)
  if (lowText === NO_VALUE && highText === NO_VALUE) return NO_VALUE
  if (highText === NO_VALUE) return `at least ${lowText}`
  if (lowText === NO_VALUE) return `at most ${highText}`
  const [lowNumber, lowUnit] = lowText.split(' ')
  return lowUnit && highText.endsWith(` ${lowUnit}`)
    ? `${lowNumber} to ${highText}`
    : `${lowText} to ${highText}`
}

/** 0.4 s, 32 s, 1 min 32 s, 2 h 05 min, 3 d 4 h. */
export function formatDuration(durationMs: Value): string {
  if (durationMs == null || !Number.isFinite(durationMs) || durationMs < 0) return NO_VALUE
  if (durationMs < 9950) return `${formatNumber(durationMs / 1000, 1)} s`
  const seconds = Math.round(durationMs / 1000)
  if (seconds < 60) return `${seconds} s`
  if (seconds < 3600) return `${Math.floor(seconds / 60)} min ${String(seconds % 60).padStart(2, '0')} s`
  const minutes = Math.round(seconds / 60)
  if (minutes < 24 * 60) return `${Math.floor(minutes / 60)} h ${String(minutes % 60).padStart(2, '0')} min`
  const hours = Math.round(minutes / 60)
  return `${Math.floor(hours / 24)} d ${hours % 24} h`
}

/** '01 Dec 2026 07:12' in the workshop's own time zone (the browser's when that is not known). */
export function formatDateTime(
  instant: string | number | Date | null | undefined,
  timeZone?: string,
): string {
  const part = partsOf(instant, timeZone)
  return part ? `${part.day} ${part.month} ${part.year} ${part.hour}:${part.minute}` : NO_VALUE
}

export function formatDate(instant: string | number | Date | null | undefined, timeZone?: string): string {
  const part = partsOf(instant, timeZone)
  return part ? `${part.day} ${part.month} ${part.year}` : NO_VALUE
}

export function formatTime(instant: string | number | Date | null | undefined, timeZone?: string): string {
  const part = partsOf(instant, timeZone)
  return part ? `${part.hour}:${part.minute}` : NO_VALUE
}

/** The time alone when it is today in the workshop, else date and time. */
export function formatTimeOrDate(
  instant: string | number | Date | null | undefined,
  now: number,
  timeZone?: string,
): string {
  return formatDate(instant, timeZone) === formatDate(now, timeZone)
    ? formatTime(instant, timeZone)
    : formatDateTime(instant, timeZone)
}

const formatters = new Map<string, Intl.DateTimeFormat>()

function partsOf(instant: string | number | Date | null | undefined, timeZone: string | undefined) {
  const at = instant == null ? NaN : new Date(instant).getTime()
  if (!Number.isFinite(at)) return null
  const parts = new Map(
    formatterOf(timeZone)
      .formatToParts(at)
      .map((part) => [part.type, part.value]),
  )
  return {
    day: parts.get('day')!,
    month: parts.get('month')!,
    year: parts.get('year')!,
    hour: parts.get('hour')!,
    minute: parts.get('minute')!,
  }
}

function formatterOf(timeZone: string | undefined): Intl.DateTimeFormat {
  const key = timeZone ?? ''
  let formatter = formatters.get(key)
  if (!formatter) {
    // en-US, because en-GB writes 'Sept' and would not line up in a column
    formatter = new Intl.DateTimeFormat('en-US', {
      day: '2-digit',
      month: 'short',
      year: 'numeric',
      hour: '2-digit',
      minute: '2-digit',
      hourCycle: 'h23',
      timeZone,
    })
    formatters.set(key, formatter)
  }
  return formatter
}

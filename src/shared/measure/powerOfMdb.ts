import { SILENCE_MDB } from '../contract/quantities.ts'

const LOWEST_DB = -300
const HIGHEST_DB = 100
const WHOLE = Float64Array.from({ length: HIGHEST_DB - LOWEST_DB + 1 }, (_, i) =>
  Math.pow(10, (i + LOWEST_DB) / 10),
)
const THOUSANDTHS = Float64Array.from({ length: 1000 }, (_, i) => Math.pow(10, i / 10_000))

/**
 * Power of a level as it travels, re (1 V)^2: 10^(mdb / 10000), from two tables because this runs for every value
 * of a frame. In: whole thousandths of a dBV. Silence gives 0; anything else outside -300..100 dBV, and
 * 'not measured', gives NaN.
 *
 * @example powerOfMdb(-20_000) // 0.01
 */
export function powerOfMdb(mdb: number): number {
  if (mdb === SILENCE_MDB) return 0
  const whole = Math.floor(mdb / 1000)
  if (!(whole >= LOWEST_DB && whole <= HIGHEST_DB)) return NaN
  return WHOLE[whole - LOWEST_DB]! * THOUSANDTHS[mdb - whole * 1000]!
}

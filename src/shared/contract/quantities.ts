import { z } from 'zod'

/**
 * Levels travel and are stored as whole thousandths of a decibel (millidecibel, mdB).
 * JSON knows neither NaN nor infinity, so the two things that are not a level have values of their own,
 * far outside what physics allows.
 */
export const SILENCE_MDB = -1_000_000
/** The channel exists but this frame holds no value for it. */
export const NOT_MEASURED_MDB = 1_000_000

const LOWEST_MDB = -300_000
const HIGHEST_MDB = 100_000

/** A level in thousandths of a dB re 1 V rms (dBV), or SILENCE_MDB, or NOT_MEASURED_MDB. */
export const LevelMdb = z
  .int()
  .refine(
    (mdb) => (mdb >= LOWEST_MDB && mdb <= HIGHEST_MDB) || mdb === SILENCE_MDB || mdb === NOT_MEASURED_MDB,
    'a level is -300000..100000 thousandths of a dB, or the value for silence or for not measured',
  )
export type LevelMdb = z.infer<typeof LevelMdb>

/** String 1 is the treble E, string 6 the bass E; element e sits under string e. */
export const StringNo = z.int().min(1).max(6)
export type StringNo = z.infer<typeof StringNo>
export const STRING_NOS = [1, 2, 3, 4, 5, 6] as const

export const Id = z.uuid()
export type Id = z.infer<typeof Id>

/** Instant in UTC, ISO 8601 with milliseconds; always the server's clock. */
export const Instant = z.iso.datetime()
export type Instant = z.infer<typeof Instant>

export const Unit = z.enum(['dB', 'dBV', 'ohm', 'Mohm', 'mA', 'uA', 'V', 'ms', 'count', 'yes/no'])
export type Unit = z.infer<typeof Unit>

/**
 * A number with a unit, an uncertainty and the count behind it; or 'at most X' when censored.
 * value null: there is no reading. u: standard uncertainty; expandedU: t_95 u, two-sided; dof: effective degrees
 * of freedom, null for infinite.
 */
export const Reading = z.object({
  value: z.number().nullable(),
  atMost: z.boolean(),
  unit: Unit,
  n: z.int().min(0),
  u: z.number().min(0).nullable(),
  expandedU: z.number().min(0).nullable(),
  dof: z.number().positive().nullable(),
})
export type Reading = z.infer<typeof Reading>

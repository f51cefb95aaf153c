/** Volts of 0 dBu: the voltage that gives 1 mW in 600 ohm, sqrt(0.6) V (IEC 60027-3 practice). */
export const DBU_REFERENCE_V = Math.sqrt(0.6)

/**
 * Level in dB re 1 V rms: 20 lg(V). In: volts rms. Out: dBV. 0 V gives -Infinity, a negative or NaN voltage NaN.
 *
 * @example dbvOfVolts(6) // 15.563...
 */
export function dbvOfVolts(volts: number): number {
  return 20 * Math.log10(volts)
}

/** Volts rms of a level: 10^(L/20). In: dBV. Out: V. -Infinity gives 0, NaN gives NaN. */
export function voltsOfDbv(levelDb: number): number {
  return Math.pow(10, levelDb / 20)
}

/** The same level re 0.7746 V: dBV - 20 lg sqrt(0.6), so 2.218 dB more. In: dBV. Out: dBu. */
export function dbuOfDbv(levelDb: number): number {
  return levelDb - dbvOfVolts(DBU_REFERENCE_V)
}

/** The same level re 1 V. In: dBu. Out: dBV. */
export function dbvOfDbu(levelDbu: number): number {
  return levelDbu + dbvOfVolts(DBU_REFERENCE_V)
}

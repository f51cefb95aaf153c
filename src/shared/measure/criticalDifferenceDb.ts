/**
 * Smallest difference between two occasions that shows a change (95 %): 1.96 sqrt(s_I1^2 + s_I2^2 + u_b1^2 + u_b2^2),
 * s_I the intermediate precision of the reading (ISO 5725-3), u_b each bench's standard uncertainty. dB in, dB out;
 * NaN when a part is.
 *
 * @example criticalDifferenceDb(1, 1, 0, 0) // 2.77...
 */
export function criticalDifferenceDb(
  sI1Db: number,
  sI2Db: number,
  uBench1Db: number,
  uBench2Db: number,
): number {
  return 1.96 * Math.hypot(sI1Db, sI2Db, uBench1Db, uBench2Db)
}

/** The same for one bench, person, string set and day: 2.8 s_r (ISO 5725-6, repeatability limit). dB in, dB out. */
export function repeatabilityLimitDb(srDb: number): number {
  return 2.8 * srDb
}

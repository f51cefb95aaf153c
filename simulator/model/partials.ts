/**
 * The spectrum of a string at the saddle, lumped into a few groups of partials. Amplitudes fall as 1/h, the
 * fundamental dominates, and higher partials die faster (trade knowledge, from memory).
 */
export const PARTIAL_ORDERS = [1, 2, 3, 4, 6, 9, 14] as const
/** how many partials each group stands for */
const GROUP_WIDTHS = [1, 1, 1, 1, 3, 4, 6] as const

export const PARTIAL_COUNT = PARTIAL_ORDERS.length

const rawPower = PARTIAL_ORDERS.map((order, g) => GROUP_WIDTHS[g]! / (order * order))
const rawSum = rawPower.reduce((sum, power) => sum + power, 0)

/** Share of the starting power in each group; the sum is 1. */
export const PARTIAL_POWER: readonly number[] = rawPower.map((power) => power / rawSum)

/** Time constant of a group against the fundamental's. */
export const PARTIAL_TAU: readonly number[] = PARTIAL_ORDERS.map((order) => 1 / (1 + 0.12 * (order - 1)))

/** Where the attack's click has its energy, Hz; it is far above every corner of the inputs. */
export const ATTACK_HZ = 3000
/** Power of the click against the string's starting power, and its amplitude time constant, s. */
export const ATTACK_POWER = 20
export const ATTACK_TAU_S = 0.008
/** Peak over rms of the attack and of the early string, amplitude. */
export const CREST = 1.5 * Math.SQRT2

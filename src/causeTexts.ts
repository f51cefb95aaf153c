import type { CauseKey } from './shared/measure/likelyCauses.ts'

export interface CauseText {
  /** follows the word 'Likely:' */
  cause: string
  /** what to do first, before anything is taken apart */
  checkFirst: string
}

/**
 * Likely causes by key, from the fault table of the trade: common practice and textbook reasoning where no published
 * source is known. {strings} is replaced by the strings that show it.
 */
export const CAUSES: Record<CauseKey, CauseText> = {
  elementOpenParallel: {
    cause:
      'the element under {strings} is open; the other five stand 1.6 dB up, as one of six in parallel missing does',
    checkFirst: 'Measure the strip\u2019s capacitance at the connector: a sixth is missing.',
  },
  elementOrChannelDead: {
    cause: 'the element under {strings} or its own channel is dead',
    checkFirst: 'Swap its lead to a good channel: does the fault follow the element or stay?',
  },
  poorSeating: {
    cause: '{strings} is badly seated: debris, or a ridge under its element',
    checkFirst: 'Press the saddle down over it and pluck: does the level jump?',
  },
  stripEnd: {
    cause: 'a lump of shield or solder, or a bend, at the end of the strip',
    checkFirst: 'Move the strip by 1 mm: does only {strings} change?',
  },
  outerStringsWeak: {
    cause: 'the saddle ends are tight or the slot ends high, so the outer strings cannot press',
    checkFirst: 'Measure the saddle\u2019s thickness at the middle and at both ends.',
  },
  middleStringsWeak: {
    cause: 'the saddle foot or the slot floor is hollow in the middle',
    checkFirst: 'Look for light under the saddle at string tension.',
  },
  slope: {
    cause: 'the saddle is tilted, the slot floor tapers, or the break angle differs from side to side',
    checkFirst: 'Compare the break angle of {strings} with the other side.',
  },
  inputLoading: {
    cause: 'something loads the elements: wrong lead, a leaky element, a low-impedance input',
    checkFirst: 'Swap the lead, then feed a tone through 470 pF into the preamp: is it right?',
  },
  controlsNotSet: {
    cause: 'volume or tone is not at the test setting, or the tuner mutes',
    checkFirst: 'Set volume full, tone flat, tuner off, and check again.',
  },
  noPower: {
    cause: 'the preamp has no power: battery, ring contact, or a three-pole lead that leaves the ring open',
    checkFirst: 'Try the bench\u2019s own two-pole lead and a fresh battery.',
  },
  stripShorted: {
    cause: 'the strip is shorted, its connector is off, or hot and shield are reversed',
    checkFirst: 'Measure the strip at its connector: a short, or no capacitance?',
  },
  ringNotClosed: {
    cause: 'the ring contact does not close: plug half in, jack depth wrong, or a worn contact',
    checkFirst: 'Push the plug home and look at the inner nut\u2019s depth.',
  },
  batteryLow: {
    cause: 'the battery is spent',
    checkFirst: 'Fit a fresh one, polarity checked, and measure under load.',
  },
  hum: {
    cause: 'a shield or string ground is missing, or the bench stands in a field',
    checkFirst:
      'Touch the strings: if the hum falls it is the ground path; if a shielded source hums too it is the bench.',
  },
  hiss: {
    cause: 'a noisy preamp input, or leakage at the elements',
    checkFirst: 'Put a shielded capacitor on the preamp\u2019s input: hiss that stays is the preamp.',
  },
  dropOuts: {
    cause: 'a worn or dirty jack, a loose nut, or a cracked lug; or the bench lead',
    checkFirst: 'Wiggle again with a second lead: if it stays, look at the jack.',
  },
  tipOpen: {
    cause: 'the tip lug or the output lead is off',
    checkFirst: 'Listen at the preamp\u2019s output: signal there and none at the tip?',
  },
  poweredUnplugged: {
    cause: 'the ring finds ground without a plug: a lug, foil or whisker',
    checkFirst: 'Measure the supply current unplugged while you move the jack\u2019s wires.',
  },
  currentHigh: {
    cause: 'a part leaks or is reversed, the output lead is shorted, or the tuner is on',
    checkFirst: 'Switch the tuner off; unplug the elements and read the current again.',
  },
  currentZero: {
    cause: 'the battery path is open: clip, polarity, ring contact',
    checkFirst: 'Follow the voltage from the battery clip to the preamp.',
  },
}

/** The words of one cause with its strings put in. */
export function causeText(key: CauseKey, strings: string): CauseText {
  const put = (text: string) => text.replace('{strings}', strings)
  return { cause: put(CAUSES[key].cause), checkFirst: put(CAUSES[key].checkFirst) }
}

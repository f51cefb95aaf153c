/**
 * Constants of method 1. Together with the code they are the method: a change here is a new method.
 * 'Design' marks a value that the definitions of the readings fix; everything else says why it is what it is.
 */

/** dB that a frame stands above its channel's own floor to be an onset. Design. */
export const ONSET_RISE_DB = 10
/** ms before a frame between which its channel's own floor, a median, is taken. Design. */
export const OWN_FLOOR_FROM_MS = 200
export const OWN_FLOOR_TO_MS = 40
/** Share of those frames that must be measured: a median of fewer is no floor. Common practice, no source. */
export const OWN_FLOOR_LEAST_SHARE = 0.5
/** dB by which an element must lead the next one for the pluck to be its string's. Design. */
export const LEAD_DB = 6

/** ms after the onset: the pluck level's window, the attack is out and the window short. Design. */
export const WINDOW_FROM_MS = 50
export const WINDOW_TO_MS = 250
/** ms after the onset at which a pluck is decided: leaves a bench 50 ms to report the pitch over the window. */
export const DECIDE_AFTER_MS = 300
/** percent: a pitch less sure than this is not used. Common practice, no source. */
export const PITCH_LEAST_CONFIDENCE = 50
/** semitones between a pitch and an expected one, at most, for it to be that string. Design. */
export const PITCH_WITHIN_SEMITONES = 0.5
/**
 * dB below the loudest element from which a pitch heard on an element no longer counts: strings that only answer
 * (string 1 rings when string 6 is plucked) lie lower, strings of a strum do not. Common practice, no source.
 */
export const PITCH_CHANNEL_WITHIN_DB = 12
/** Pitch reports kept for the decision: six channels, one report in 60 ms, 300 ms, doubled. */
export const PITCHES_KEPT = 64

/** dB over the median of 60 to 20 ms earlier that two frames running must have to be a new excitation. */
export const RISE_DB = 4
export const RISE_FROM_MS = 60
export const RISE_TO_MS = 20
/**
 * dB that a rise may stay below the loudest frame of the half second before: a beating string recovers from its
 * minimum too, but never to more than it was.
 */
export const RISE_BELOW_RECENT_DB = 3
export const RISE_RECENT_FROM_MS = 500
/** ms after an onset before which a rise is still its attack: the median above must lie behind the onset. */
export const SECOND_ONSET_FROM_MS = 80
/** dB below the loudest element from which a rise changes the pluck by less than 0.05 dB and does not count. */
export const SECOND_ONSET_WITHIN_DB = 20
/** dB above the muted floor from which a string counts as still ringing. */
export const RINGING_DB = 10
/** dB that a pluck must stand above what still rang: 20 dB cost 0.04 dB. */
export const DAMPED_BELOW_DB = 20

/** dB above the floor below which a pluck is only 'at most floor + 6 dB'. Design, after ISO 3744. */
export const CENSOR_DB = 6
/** dB above its floor that another element must reach over the window to confirm a pluck that is not heard. */
export const CONFIRM_DB = 10
/** dB from the median of the six within which an element belongs to the reference. Design. */
export const REFERENCE_WITHIN_DB = 6
/** Accepted plucks below which a string's rules are invalid. Design. */
export const LEAST_PLUCKS = 3
/** Times that a string is asked for and not heard before it is silent. Design. */
export const NO_SIGNAL_TIMES = 3
/** Most plucks of a string are this many times the wanted number, plus the next constant. Design: 2n + 2. */
export const TRIES_FACTOR = 2
export const TRIES_EXTRA = 2
/** Instruments behind a pattern below which it is not in force. Design. */
export const PATTERN_LEAST_INSTRUMENTS = 10
/** ms of a channel's latest frames that must be below floor + 6 dB for 'nothing came' to be believed. */
export const NOTHING_CAME_MS = 200
/** ms after a pluck that only other channels heard in which a person's 'nothing came' means that same pluck. */
export const SAME_PLUCK_MS = 2000

/** ms of each block that the search for a quiet stretch works in. */
export const BLOCK_MS = 200
/** dB between the loudest and the quietest block of a quiet stretch, at most. Common practice, no source. */
export const QUIET_SPREAD_DB = 3
/** ms, shortest muted stretch, and shortest when hum is judged. Design. */
export const NOISE_LEAST_MS = 2000
export const NOISE_LEAST_WITH_HUM_MS = 5000
/** ms without a quiet stretch after which the screen says so and a person may go on with the latest one. */
export const NOT_YET_QUIET_MS = 8000
/**
 * ms after which the latest stretch is taken as it is: an instrument that crackles is never quiet and must be judged
 * noisy, not waited for.
 */
export const NOISE_PATIENCE_MS = 30_000

/** ms that the plug must be seen out before it is asked for. */
export const UNPLUGGED_MS = 500
/** ms after plugging in, least and most; supply and coupling capacitors take 2 to 12 s (trade, arithmetic). */
export const SETTLE_LEAST_MS = 3000
export const SETTLE_MOST_MS = 15_000
/** dB/s that every channel's floor may drift, the last second against the one two seconds before it. */
export const SETTLE_DRIFT_DB_PER_S = 0.1
/** ms that the jack is watched at rest, and ms after which it is taken even if a contact is disturbed. */
export const JACK_REST_MS = 1000
export const JACK_REST_MOST_MS = 5000
/** ms after which the wiggle begins by itself: both hands are busy. */
export const WIGGLE_READY_MS = 4000
/** ms after the wiggle in which reports of what started inside it are still taken. */
export const WIGGLE_GRACE_MS = 300
/**
 * ms after the plug was first seen out in the wiggle from which one that is out ends it, as not measured: time to put
 * it back and wiggle once or twice more. Common practice, no source.
 */
export const WIGGLE_PLUG_OUT_MOST_MS = 30_000
/**
 * Share of the wiggle's frames in which a bench that measures the tip must have measured it: fewer is no wiggle that
 * was watched. Common practice, no source.
 */
export const WIGGLE_TIP_LEAST_SHARE = 0.9

/** dB, half a step of what travels (0.001 dB) is the limit of resolution: u = step / sqrt 12. */
export const LEVEL_STEP_DB = 0.001
/** dB/s used when no decay could be fitted: the fastest treble string (trade, arithmetic, from memory). */
export const DECAY_FALLBACK_DB_PER_S = 29
/** Coverage of an expanded uncertainty. Design. */
export const COVERAGE = 0.95
/** Draws and seed of the simulation behind the uncertainty of range and step (JCGM 101). */
export const SIMULATION_DRAWS = 10_000
export const SIMULATION_SEED = 20_106

/** Minutes since stringing below which a run warns. Design. */
export const FRESH_STRINGS_MINUTES = 10

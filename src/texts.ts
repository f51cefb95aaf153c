import type {
  DropReason,
  MeasuredRun,
  Pluck,
  PromptKey,
  RuleResult,
  RunPhase,
  StringState,
  Verdict,
} from './shared/contract/measured.ts'
import type { ChannelKind } from './shared/contract/frames.ts'
import type { RunReason, RunStatus, RunView, RunConditions } from './shared/contract/runs.ts'
import type { ErrorCode } from './shared/contract/errors.ts'
import { ERRORS } from './shared/contract/errors.ts'
import { RULES } from './shared/contract/rules.ts'
import type { RuleId } from './shared/contract/rules.ts'

/** Words of the screens by key. English only. */

export interface TextPair {
  title: string
  remedy: string
}

/** {string} stands for 'string 4, D' or, on a 12-string, 'course 4, D'. */
export const PROMPTS: Record<PromptKey, string> = {
  leaveUnplugged: 'Leave it unplugged',
  plugIn: 'Plug in',
  waitSettle: 'Wait, let it settle',
  holdStill: 'Hands off, keep still',
  muteAll: 'Mute all strings',
  keepMuted: 'Keep them muted',
  dampThenPluck: 'Damp, then pluck {string}',
  pluckAgain: 'Damp, then pluck {string} again',
  pluckMore: 'Once more: damp, then pluck {string}',
  getReadyToWiggle: 'Mute, then take hold of the plug',
  wiggleNow: 'Wiggle the plug: four ways, one full turn',
  enterValues: 'Type in what the bench cannot measure',
  finished: 'Done',
  stopped: 'Stopped',
}

/** How to do it, in smaller print under the prompt. */
export const PROMPT_HINTS: Record<PromptKey, string> = {
  leaveUnplugged: 'The bench looks at the jack with nothing in it.',
  plugIn: 'Push the plug all the way in. Monitor down, phantom power off.',
  waitSettle: 'The preamp has just switched on.',
  holdStill: 'The bench looks at the jack at rest.',
  muteAll: 'Felt or flat hand over all six. It starts by itself once they are quiet.',
  keepMuted: 'The noise is being measured. Touch nothing else.',
  dampThenPluck: 'One clean pluck. Any other string is fine too, the bench tells which.',
  pluckAgain: 'The last one did not count. Damp all, then one clean pluck.',
  pluckMore: 'These plucks lie too far apart or too near a limit. More of them will settle it.',
  getReadyToWiggle: 'It starts by itself in a moment; the pedal or Space starts it now.',
  wiggleNow: 'Up, down, left, right, then all the way round.',
  enterValues: 'Read your meter, type the value and how sure it is. Leave empty what you did not measure.',
  finished: 'The check is over.',
  stopped: 'The check was stopped. What was measured is kept.',
}

/** 'string 4, D', or 'course 4, D' where an element serves a pair. */
export function stringText(stringNo: number, name: string | null, strings: 'six' | 'twelve' = 'six'): string {
  const word = strings === 'twelve' ? 'course' : 'string'
  return name ? `${word} ${stringNo}, ${name}` : `${word} ${stringNo}`
}

/** The one sentence that says what to do next. */
export function promptText(
  prompt: PromptKey,
  stringNo: number | null,
  name: string | null,
  strings: 'six' | 'twelve' = 'six',
): string {
  const which =
    stringNo == null
      ? `any ${strings === 'twelve' ? 'course' : 'string'}`
      : stringText(stringNo, name, strings)
  return PROMPTS[prompt].replace('{string}', which)
}

export const PHASES: Record<RunPhase, string> = {
  unplugged: 'Unplugged',
  settle: 'Settle',
  jackRest: 'Jack at rest',
  noise: 'Noise',
  strings: 'Strings',
  wiggleReady: 'Ready to wiggle',
  wiggle: 'Wiggle',
  entry: 'By hand',
  done: 'Done',
  stopped: 'Stopped',
}

export const DROP_REASONS: Record<DropReason, string> = {
  strum: 'Two strings at once. Pluck one.',
  secondOnset: 'Struck twice. Pluck once and let it ring.',
  clipped: 'Too hard, it clipped. Pluck softer.',
  wrongPitch: 'Pitch is off. Tune the string.',
  notDamped: 'Another string still rang. Damp all first.',
  shortWindow: 'Stopped too soon. Let it ring for a moment.',
  interrupted: 'The bench missed a moment. Pluck again.',
  belowFloor: 'Too quiet to stand out from the noise.',
  setAside: 'Set aside: the string was repeated.',
  stringDone: 'This string was done already.',
}

export const TOLD_BY: Record<Pluck['toldBy'], string> = {
  pitch: 'by pitch',
  lead: 'by the loudest element',
  prompt: 'by prompt',
  person: 'by the person',
}

export const STRING_STATES: Record<StringState, string> = {
  todo: 'to do',
  done: 'done',
  silent: 'no signal',
  triesUsed: 'tries used up',
}

export const RESULTS: Record<RuleResult['result'], string> = {
  within: 'within',
  outside: 'outside',
  invalid: 'not valid',
  notTested: 'not tested',
}

export const WHYS: Record<NonNullable<RuleResult['why']>, string> = {
  beyondLimit: 'beyond the limit',
  inGuardBand: 'in the guard band: not shown to conform',
  noSignal: 'no signal',
  scatterTooLarge: 'the plucks lie too far apart',
  tooFewPlucks: 'too few good plucks',
  notMeasurable: 'this bench cannot measure it',
  notReached: 'the check did not get this far',
  patternNotSet: 'no pattern for this model yet: advice only',
  censoredAcrossLimit: 'only an upper bound, and the limit lies below it',
  notFinite: 'the reading is not a number',
  disagreesWithState: 'does not fit what the jack shows',
  noReference: 'no reference: too few strings speak alike',
}

export const WARNINGS: Record<MeasuredRun['warnings'][number], TextPair> = {
  stringsFresh: {
    title: 'Strings are younger than 10 minutes.',
    remedy: 'Levels may still move. Wait, or note it.',
  },
  patternNotSet: {
    title: 'Pattern not set.',
    remedy: 'Balance advises only; it does not decide the verdict.',
  },
  benchNotVerified: {
    title: 'This bench is not verified.',
    remedy: 'The verdict will be none. Verify the bench first.',
  },
  batteryLow: { title: 'Battery is low.', remedy: 'Fit a fresh one before you go on.' },
  notYetQuiet: { title: 'Not quiet yet.', remedy: 'Mute all strings and keep still.' },
  ruleNotMeasurable: {
    title: 'This bench cannot measure every rule.',
    remedy:
      'What a meter can read may be typed in before the wiggle ends: \u2018Enter a reading by hand\u2019.',
  },
  controlsNotSet: {
    title: 'Controls were not said to be set.',
    remedy: 'Levels depend on them. Set volume and tone as the model asks and check again.',
  },
}

export const VERDICTS: Record<Verdict, string> = { pass: 'Pass', fail: 'Fail', none: 'No verdict' }

export const RUN_REASONS: Record<RunReason, string> = {
  new: 'New instrument',
  retest: 'Re-test',
  afterRework: 'After rework',
  return: 'Return',
  practice: 'Practice',
  recording: 'Recording',
}

/** Runs that are kept and shown, and enter no verdict of the workshop's figures. */
export const UNCOUNTED: Partial<Record<RunReason, string>> = {
  practice: 'Practice, counts for nothing',
  recording: 'Recording, counts for nothing',
}

export const RUN_STATUSES: Record<RunStatus, string> = {
  open: 'Running',
  sealed: 'Sealed',
  stopped: 'Stopped',
  interrupted: 'Interrupted',
}

export const STORAGES: Record<RunView['storage'], string> = {
  live: 'Measuring',
  judgedNotStored: 'Judged, not yet stored: leave it plugged in',
  stored: 'Stored',
}

export const EXCITATIONS: Record<RunConditions['excitation'], string> = {
  hand: 'Hand',
  wire: 'Breaking wire',
  mechanical: 'Plucking machine',
}

export const MUTES: Record<RunConditions['mute'], string> = { felt: 'Felt', hand: 'Flat hand' }

/** What a rule is called on screen. */
export function ruleName(rule: RuleId): string {
  return RULES[rule].name
}

/** As ruleName, and for S/N the point at which level and noise were both read. */
export function ruleNameOn(rule: RuleId, channelKind: ChannelKind): string {
  if (rule === 'snA') return `S/N A ${AT_POINT[channelKind]}, worst`
  if (rule === 'snFlat') return `S/N ${AT_POINT[channelKind]}, worst`
  return ruleName(rule)
}
const AT_POINT: Record<ChannelKind, string> = { six: 'at each element', one: 'at the jack' }

/** What became of the live connection. */
export const LIVE_STATES = {
  off: 'not connected',
  connecting: 'connecting',
  connected: 'connected',
  reconnecting: 'connection lost, trying again',
  offline: 'no connection, trying again',
} as const satisfies Record<string, string>

/** Problems that no server can report, because it was not reached or not understood. */
export const CLIENT_PROBLEMS = {
  'client.offline': {
    title: 'The server does not answer.',
    remedy: 'Check the network cable or the Wi-Fi. This page tries again by itself.',
  },
  'client.answer': {
    title: 'This page does not understand the answer.',
    remedy: 'Load the page again: it may be older than the server.',
  },
} as const satisfies Record<string, TextPair>

export type ClientCode = keyof typeof CLIENT_PROBLEMS

export function problemText(code: ErrorCode | ClientCode): TextPair {
  return code in CLIENT_PROBLEMS ? CLIENT_PROBLEMS[code as ClientCode] : ERRORS[code as ErrorCode]
}

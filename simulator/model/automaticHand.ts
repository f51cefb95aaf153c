import type { RunPrompt } from '../../src/shared/contract/frames.ts'
import type { PromptKey } from '../../src/shared/contract/measured.ts'
import { makeRandom } from './random.ts'

/** What a hand can do at the bench. */
export type HandAct =
  { kind: 'plug' | 'unplug' | 'damp' | 'wiggle' | 'pedal' } | { kind: 'pluck'; stringNo: number }

/** What a person sees and hears without the screen. */
export interface HandSight {
  plugged: boolean
  /** the last pluck moved a level somewhere on the bench */
  pluckSeen: boolean
}

export interface AutomaticHand {
  prompt(prompt: Pick<RunPrompt, 'prompt' | 'stringNo'>): void
  /** called once a frame; what it does before this frame is measured */
  step(sight: HandSight): HandAct[]
  /** a run begins: hands off until the first prompt */
  restart(): void
}

interface Step {
  atFrame: number
  act: HandAct | null
  /** done only when the last pluck was not to be seen */
  onlyIfUnseen?: boolean
}

/** Human pace, s: to read a sentence and move; to let a string ring; a damped string until the next pluck. */
const REACT_S = 0.5
const RING_S = 0.6
const DAMPED_S = 0.42
const LOOK_S = 0.45
const WIGGLE_S = 7.3
const ENTRY_PATIENCE_S = 2

/** Plugged in anew in the middle of a run: supply and coupling capacitors take up to 12 s (trade, arithmetic). */
const SETTLE_S = 12

const PLUCK_PROMPTS: readonly PromptKey[] = ['dampThenPluck', 'pluckAgain', 'pluckMore']
/** A plug that fell out, or a bench that was restarted: a person puts it back in first. */
const NEEDS_PLUG: readonly PromptKey[] = [
  ...PLUCK_PROMPTS,
  'waitSettle',
  'holdStill',
  'muteAll',
  'keepMuted',
  'getReadyToWiggle',
  'wiggleNow',
]

/**
 * A hand that follows the prompts at human pace: unplugs, plugs in, mutes, damps and plucks the string that is asked
 * for, wiggles. When a pluck is nowhere to be seen it says so with the foot switch. It counts frames, not wall time,
 * so that a seed and the same prompts give the same acts.
 */
export function makeAutomaticHand(seed: number, frameMs: number): AutomaticHand {
  const random = makeRandom(seed, 'automatic hand')
  let frame = 0
  let wish: Pick<RunPrompt, 'prompt' | 'stringNo'> | null = null
  let plan: Step[] = []
  let muted = false

  /** a time in frames, a fifth longer or shorter as hands are */
  function frames(seconds: number): number {
    return Math.max(1, Math.round((seconds * 1000 * (1 + 0.1 * random.normalWithin(2))) / frameMs))
  }

  function then(...steps: (readonly [seconds: number, act: HandAct | null, onlyIfUnseen?: boolean])[]): void {
    let atFrame = frame
    for (const [seconds, act, onlyIfUnseen] of steps) {
      atFrame += frames(seconds)
      plan.push({ atFrame, act, onlyIfUnseen: onlyIfUnseen ?? false })
    }
  }

  function mute(): void {
    if (!muted) then([REACT_S, { kind: 'damp' }])
    muted = true
  }

  function planFor(prompt: PromptKey, stringNo: number | null, sight: HandSight): void {
    if (!sight.plugged && NEEDS_PLUG.includes(prompt)) {
      then([REACT_S + 0.3, { kind: 'plug' }], [SETTLE_S, null])
      return
    }
    if (PLUCK_PROMPTS.includes(prompt)) {
      if (stringNo === null) return
      muted = false
      then(
        [0.15, { kind: 'damp' }],
        [DAMPED_S, { kind: 'pluck', stringNo }],
        [LOOK_S, { kind: 'pedal' }, true],
        [Math.max(0.15, RING_S - LOOK_S), null],
      )
      return
    }
    switch (prompt) {
      case 'leaveUnplugged':
        if (sight.plugged) then([REACT_S, { kind: 'unplug' }])
        return
      case 'plugIn':
        if (!sight.plugged) then([REACT_S + 0.3, { kind: 'plug' }], [0.5, null])
        return
      case 'waitSettle':
      case 'holdStill':
      case 'muteAll':
      case 'keepMuted':
        mute()
        return
      case 'getReadyToWiggle':
        then([REACT_S, { kind: 'pedal' }], [1.5, null])
        return
      case 'wiggleNow':
        then([REACT_S, { kind: 'wiggle' }], [WIGGLE_S, null])
        return
      case 'enterValues':
        then([ENTRY_PATIENCE_S, { kind: 'pedal' }])
        return
      default:
        return
    }
  }

  return {
    prompt(next) {
      const changed = wish === null || wish.prompt !== next.prompt || wish.stringNo !== next.stringNo
      wish = next
      if (!changed) return
      // a pluck that has begun is finished; anything else gives way to the new sentence
      if (!PLUCK_PROMPTS.includes(next.prompt)) plan = []
    },
    restart() {
      wish = null
      plan = []
      muted = false
    },
    step(sight) {
      frame += 1
      if (wish !== null && plan.length === 0) planFor(wish.prompt, wish.stringNo, sight)
      const acts: HandAct[] = []
      while (plan.length > 0 && plan[0]!.atFrame <= frame) {
        const step = plan.shift()!
        if (step.act && !(step.onlyIfUnseen && sight.pluckSeen)) acts.push(step.act)
      }
      return acts
    },
  }
}

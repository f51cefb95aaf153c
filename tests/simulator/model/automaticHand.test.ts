import { describe, expect, it } from 'vitest'
import { makeAutomaticHand } from '../../../simulator/model/automaticHand.ts'
import type { HandAct, HandSight } from '../../../simulator/model/automaticHand.ts'
import type { PromptKey } from '../../../src/shared/contract/measured.ts'

const SEEN: HandSight = { plugged: true, pluckSeen: true }

/** What a hand does over so many frames, with the frame it does it in. */
function watch(
  hand: ReturnType<typeof makeAutomaticHand>,
  frames: number,
  sight: HandSight = SEEN,
): { frame: number; act: HandAct }[] {
  return Array.from({ length: frames }, (_, frame) => hand.step(sight).map((act) => ({ frame, act }))).flat()
}

function ask(prompt: PromptKey, stringNo: number | null = null) {
  const hand = makeAutomaticHand(3, 10)
  hand.prompt({ prompt, stringNo })
  return hand
}

describe('makeAutomaticHand()', () => {
  it('keeps still until a prompt comes', () => {
    expect(watch(makeAutomaticHand(3, 10), 500)).toEqual([])
  })

  it('plugs in once, and unplugs when it should not be plugged', () => {
    const unplugged = { plugged: false, pluckSeen: false }
    expect(watch(ask('plugIn'), 100, unplugged).map(({ act }) => act.kind)).toEqual(['plug'])
    expect(watch(ask('plugIn'), 300)).toEqual([])
    expect(watch(ask('leaveUnplugged'), 60).map(({ act }) => act.kind)).toEqual(['unplug'])
  })

  it('puts a plug that is out back in before it goes on, and lets the preamp settle', () => {
    const acts = watch(ask('dampThenPluck', 4), 300, { plugged: false, pluckSeen: false })
    expect(acts.map(({ act }) => act.kind)).toEqual(['plug'])
  })

  it('damps, waits and plucks the string that is asked for, again and again', () => {
    const acts = watch(ask('dampThenPluck', 4), 400)
    expect(acts.map(({ act }) => act.kind).slice(0, 4)).toEqual(['damp', 'pluck', 'damp', 'pluck'])
    const plucks = acts.filter(({ act }) => act.kind === 'pluck')
    expect(plucks.every(({ act }) => act.kind === 'pluck' && act.stringNo === 4)).toBe(true)
    // at least 200 ms of damped string before, at least half a second of ringing after each pluck
    expect(acts[1]!.frame - acts[0]!.frame).toBeGreaterThanOrEqual(30)
    expect(acts[2]!.frame - acts[1]!.frame).toBeGreaterThanOrEqual(50)
  })

  it('says with the foot switch that a pluck is nowhere to be seen', () => {
    const unseen = { plugged: true, pluckSeen: false }
    expect(
      watch(ask('dampThenPluck', 2), 130, unseen)
        .map(({ act }) => act.kind)
        .slice(0, 3),
    ).toEqual(['damp', 'pluck', 'pedal'])
    expect(watch(ask('dampThenPluck', 2), 130).map(({ act }) => act.kind)).not.toContain('pedal')
  })

  it('mutes once and then holds still', () => {
    expect(watch(ask('muteAll'), 1000).map(({ act }) => act.kind)).toEqual(['damp'])
  })

  it('wiggles as long as it is asked to', () => {
    expect(watch(ask('wiggleNow'), 1700).map(({ act }) => act.kind)).toEqual(['wiggle', 'wiggle', 'wiggle'])
  })

  it('finishes a pluck that it has begun before it takes the next string', () => {
    const hand = ask('dampThenPluck', 6)
    watch(hand, 30)
    hand.prompt({ prompt: 'dampThenPluck', stringNo: 5 })
    const plucks = watch(hand, 200).filter(({ act }) => act.kind === 'pluck')
    expect(plucks.map(({ act }) => (act.kind === 'pluck' ? act.stringNo : 0)).slice(0, 2)).toEqual([6, 5])
  })

  it('lets go at once when something else than a pluck is asked for', () => {
    const hand = ask('dampThenPluck', 6)
    watch(hand, 20)
    hand.prompt({ prompt: 'stopped', stringNo: null })
    expect(watch(hand, 300)).toEqual([])
  })

  it('does the same for the same seed, and at other moments for another', () => {
    const acts = (seed: number) => {
      const hand = makeAutomaticHand(seed, 10)
      hand.prompt({ prompt: 'dampThenPluck', stringNo: 1 })
      return watch(hand, 500)
    }
    expect(acts(8)).toEqual(acts(8))
    expect(acts(9)).not.toEqual(acts(8))
  })
})

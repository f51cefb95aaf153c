import { AT_MOST, NO_VALUE, formatBalance, formatSigned, formatU } from '../../format.ts'
import type { RuleResult, StringState } from '../../shared/contract/measured.ts'
import { STRING_STATES } from '../../texts.ts'

export interface EvenLineProps {
  /** string 1 first; null: no balance (yet) */
  balancesDb: readonly (number | null)[]
  /** the permitted band; null: no such limit, and then nothing is judged against it */
  lowDb: number | null
  highDb: number | null
  handedness: 'right' | 'left'
  /** note names, string 1 first */
  names?: readonly (string | null)[]
  /** one more line under each name, such as the level: string 1 first */
  captions?: readonly (string | null)[]
  states?: readonly StringState[]
  /** the balance rule's own result for each string, where it is known: it outranks the limits drawn here */
  results?: readonly (RuleResult['result'] | null)[]
  expandedU?: readonly (number | null)[]
  n?: readonly (number | null)[]
  /** string 1 first: the balance is an upper bound */
  atMost?: readonly boolean[]
  /** not all six are in: heads are hollow and nothing closes */
  provisional: boolean
  activeStringNo?: number | null
  size?: 'large' | 'small'
}

export interface EvenLinePost {
  stringNo: number
  name: string | null
  caption: string | null
  /** place along the rule, percent of its length */
  atPercent: number
  balanceDb: number | null
  /** px below the rule (above: negative), clamped to the drawing */
  offsetPx: number
  shape: 'inside' | 'outside' | 'none'
  hollow: boolean
  /** drawn nearer to the rule than it is */
  clamped: boolean
  atMost: boolean
  active: boolean
  valueText: string
  detailText: string
  stateText: string
}

/** Drawn half-height in dB unless the permitted band needs more: the same picture for every instrument. */
const SCALE_DB = 6
/** The posts stand a little left of the middle of their sixth, because the number stands at their right. */
const PLACE_IN_SIXTH = 0.36

/** dB from the rule to the edge of the drawing. */
export function scaleDbOf(lowDb: number | null, highDb: number | null): number {
  return Math.max(SCALE_DB, 1.6 * Math.abs(lowDb ?? 0), 1.6 * Math.abs(highDb ?? 0))
}

/** String numbers from the left: bass to treble, mirrored for a left-handed instrument. */
export function orderOf(handedness: 'right' | 'left'): number[] {
  return handedness === 'left' ? [1, 2, 3, 4, 5, 6] : [6, 5, 4, 3, 2, 1]
}

function shapeOf(
  props: EvenLineProps,
  index: number,
  balanceDb: number | null,
  atMost: boolean,
): EvenLinePost['shape'] {
  if (balanceDb === null) return 'none'
  const result = props.results?.[index]
  if (result === 'outside') return 'outside'
  if (result === 'within') return 'inside'
  if (atMost) return props.lowDb !== null && balanceDb < props.lowDb ? 'outside' : 'inside'
  const inside =
    (props.lowDb === null || balanceDb >= props.lowDb) && (props.highDb === null || balanceDb <= props.highDb)
  return inside ? 'inside' : 'outside'
}

/** The six posts from left to right. A balance that is not finite is drawn as no balance at all. */
export function evenLinePosts(props: EvenLineProps, halfHeightPx: number): EvenLinePost[] {
  const scaleDb = scaleDbOf(props.lowDb, props.highDb)
  return orderOf(props.handedness).map((stringNo, place) => {
    const index = stringNo - 1
    const given = props.balancesDb[index] ?? null
    const balanceDb = given !== null && Number.isFinite(given) ? given : null
    const atMost = balanceDb !== null && (props.atMost?.[index] ?? false)
    const drawnDb = Math.min(scaleDb, Math.max(-scaleDb, balanceDb ?? 0))
    const state = props.states?.[index]
    const n = props.n?.[index] ?? null
    const u = props.expandedU?.[index] ?? null
    return {
      stringNo,
      name: props.names?.[index] ?? null,
      caption: props.captions?.[index] ?? null,
      atPercent: ((place + PLACE_IN_SIXTH) / 6) * 100,
      balanceDb,
      offsetPx: balanceDb === null ? 0 : (-drawnDb / scaleDb) * halfHeightPx,
      shape: shapeOf(props, index, balanceDb, atMost),
      hollow: props.provisional || atMost,
      clamped: balanceDb !== null && drawnDb !== balanceDb,
      atMost,
      active: props.activeStringNo === stringNo,
      valueText: balanceDb === null ? '' : `${atMost ? `${AT_MOST} ` : ''}${formatSigned(balanceDb)}`,
      detailText: [u === null ? '' : formatU(u), n === null ? '' : `n ${n}`].filter(Boolean).join(' '),
      stateText: state === 'silent' || state === 'triesUsed' ? STRING_STATES[state] : '',
    }
  })
}

/** True when all six are in and stand inside both limits: the rule closes at its ends. */
export function isEven(props: EvenLineProps, posts: readonly EvenLinePost[]): boolean {
  return (
    !props.provisional &&
    (props.lowDb !== null || props.highDb !== null) &&
    posts.every((post) => post.shape === 'inside' && !post.atMost)
  )
}

export function bandText(lowDb: number | null, highDb: number | null): string {
  if (lowDb === null && highDb === null) return 'No limits.'
  if (lowDb === null) return `Permitted up to ${formatBalance(highDb)}.`
  if (highDb === null) return `Permitted from ${formatBalance(lowDb)}.`
  return `Permitted ${formatSigned(lowDb)} to ${formatBalance(highDb)}.`
}

function postText(post: EvenLinePost): string {
  const value =
    post.balanceDb === null
      ? post.stateText || 'not yet'
      : `${post.atMost ? 'at most ' : ''}${formatBalance(post.balanceDb)}${post.shape === 'outside' ? ', outside' : ''}`
  return `${post.stringNo}${post.name ? ` ${post.name}` : ''} ${value}`
}

/** The whole picture as one sentence or two. */
export function evenLineSentence(props: EvenLineProps, posts: readonly EvenLinePost[]): string {
  const head =
    props.handedness === 'left' ? 'Balance by string, treble to bass' : 'Balance by string, bass to treble'
  const end = isEven(props, posts) ? 'All six inside.' : props.provisional ? 'Provisional.' : ''
  return [`${head}: ${posts.map(postText).join('; ')}.`, bandText(props.lowDb, props.highDb), end]
    .filter(Boolean)
    .join(' ')
}

/** Cells of the hidden table: what the picture shows, one row a string. */
export function evenLineRow(post: EvenLinePost): {
  string: string
  balance: string
  detail: string
  state: string
} {
  return {
    string: `${post.stringNo}${post.name ? ` ${post.name}` : ''}`,
    balance: post.balanceDb === null ? NO_VALUE : `${post.valueText} dB`,
    detail: post.detailText || NO_VALUE,
    state:
      post.balanceDb === null
        ? post.stateText || 'no balance yet'
        : post.shape === 'outside'
          ? 'outside'
          : post.hollow
            ? 'provisional'
            : 'inside',
  }
}

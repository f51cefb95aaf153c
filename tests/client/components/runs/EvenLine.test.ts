import { mount } from '@vue/test-utils'
import { describe, expect, test } from 'vitest'
import EvenLine from '../../../../src/components/runs/EvenLine.vue'
import { evenLinePosts } from '../../../../src/components/runs/evenLine.ts'
import type { EvenLineProps } from '../../../../src/components/runs/evenLine.ts'

const SOUND: EvenLineProps = {
  balancesDb: [0.4, -0.6, 0.2, 1.1, -0.9, -0.2],
  lowDb: -2.5,
  highDb: 2.5,
  handedness: 'right',
  names: ['E', 'B', 'G', 'D', 'A', 'E'],
  expandedU: [0.7, 0.7, 0.7, 0.7, 0.7, 0.7],
  n: [3, 3, 3, 4, 3, 3],
  provisional: false,
}

const draw = (over: Partial<EvenLineProps> = {}) => mount(EvenLine, { props: { ...SOUND, ...over } })
const replaced = <T>(list: readonly T[], stringNo: number, value: T): T[] => list.with(stringNo - 1, value)
type Drawn = ReturnType<typeof draw>
const post = (line: Drawn, stringNo: number) => line.get(`[data-string="${stringNo}"]`)
const order = (line: Drawn) =>
  line.findAll('[data-string]').map((one) => Number(one.attributes('data-string')))
const sentence = (line: Drawn) => line.get('[role="img"]').attributes('aria-label') ?? ''

describe('EvenLine', () => {
  test('stands bass at the left, treble at the right', () => {
    expect(order(draw())).toEqual([6, 5, 4, 3, 2, 1])
  })

  test('is mirrored for a left-handed instrument', () => {
    const line = draw({ handedness: 'left' })
    expect(order(line)).toEqual([1, 2, 3, 4, 5, 6])
    expect(sentence(line)).toContain('treble to bass')
  })

  test('raises a post that is loud and sinks one that is quiet, in proportion', () => {
    const posts = evenLinePosts({ ...SOUND, balancesDb: [3, -3, 1.5, 0, 0, 0] }, 120)
    const at = (stringNo: number) => posts.find((one) => one.stringNo === stringNo)!.offsetPx
    expect(at(1)).toBe(-at(2))
    expect(at(1)).toBe(2 * at(3))
    expect(at(1)).toBeLessThan(0)
  })

  test('closes the rule at both ends when all six stand inside', () => {
    expect(draw().findAll('.end')).toHaveLength(2)
  })

  test('stays open while provisional, with hollow heads', () => {
    const line = draw({ provisional: true })
    expect(line.findAll('.end')).toHaveLength(0)
    expect(line.findAll('.post--hollow')).toHaveLength(6)
    expect(sentence(line)).toContain('Provisional')
  })

  test('stays open without limits, because nothing was judged', () => {
    const line = draw({ lowDb: null, highDb: null })
    expect(line.findAll('.end')).toHaveLength(0)
    expect(line.find('.lane').exists()).toBe(false)
  })

  test('gives a post outside another shape and its number', () => {
    const line = draw({ balancesDb: replaced(SOUND.balancesDb, 4, -3.4) })
    expect(post(line, 4).find('path.mark').exists()).toBe(true)
    expect(post(line, 4).find('circle').exists()).toBe(false)
    expect(post(line, 4).text()).toContain('\u22123.4')
    expect(post(line, 5).find('circle.mark').exists()).toBe(true)
    expect(line.findAll('.end')).toHaveLength(0)
    expect(sentence(line)).toContain('4 D \u22123.4 dB, outside')
  })

  test('takes exactly the limit as inside', () => {
    expect(draw({ balancesDb: [2.5, -2.5, 0, 0, 0, 0] }).findAll('.end')).toHaveLength(2)
  })

  test("follows the rule's own result where it differs from the drawn limits", () => {
    const line = draw({ results: replaced<'outside' | null>(Array(6).fill(null), 6, 'outside') })
    expect(post(line, 6).find('path.mark').exists()).toBe(true)
    expect(line.findAll('.end')).toHaveLength(0)
  })

  test('shows the number in a thumbnail only for a post outside', () => {
    const line = draw({ size: 'small', balancesDb: replaced(SOUND.balancesDb, 1, 4.7) })
    expect(line.findAll('.value').map((one) => one.text())).toEqual(['+4.7'])
    expect(line.find('table').exists()).toBe(false)
  })

  test('writes uncertainty and count at each post', () => {
    expect(post(draw(), 3).get('.detail').text()).toBe('\u00b10.7 n 3')
    expect(post(draw(), 4).get('.detail').text()).toBe('\u00b10.7 n 4')
  })

  test('clamps a value beyond the drawing and breaks its post, but writes the true number', () => {
    const line = draw({ balancesDb: replaced(SOUND.balancesDb, 2, -14.2) })
    expect(post(line, 2).find('.break').exists()).toBe(true)
    expect(post(line, 2).text()).toContain('\u221214.2')
    const posts = evenLinePosts({ ...SOUND, balancesDb: [-14.2, -6, 0, 0, 0, 0] }, 130)
    expect(posts.find((one) => one.stringNo === 1)!.offsetPx).toBe(130)
    expect(posts.filter((one) => one.clamped).map((one) => one.stringNo)).toEqual([1])
  })

  test('draws an upper bound with an arrow and does not close over it', () => {
    const line = draw({
      balancesDb: replaced(SOUND.balancesDb, 5, -1),
      atMost: replaced(Array<boolean>(6).fill(false), 5, true),
    })
    expect(post(line, 5).find('.at-most').exists()).toBe(true)
    expect(post(line, 5).text()).toContain('\u2264 \u22121.0')
    expect(line.findAll('.end')).toHaveLength(0)
    expect(sentence(line)).toContain('5 A at most \u22121.0 dB')
  })

  test('leaves a tick where there is no balance and says why', () => {
    const line = draw({
      balancesDb: replaced<number | null>(SOUND.balancesDb, 2, null),
      states: ['done', 'silent', 'done', 'done', 'done', 'done'],
    })
    expect(post(line, 2).find('.tick').exists()).toBe(true)
    expect(post(line, 2).find('.mark').exists()).toBe(false)
    expect(post(line, 2).text()).toContain('no signal')
    expect(line.findAll('.end')).toHaveLength(0)
  })

  test('draws no balance for one that is not a number', () => {
    const line = draw({ balancesDb: replaced(SOUND.balancesDb, 2, NaN) })
    expect(post(line, 2).find('.mark').exists()).toBe(false)
    expect(line.findAll('.end')).toHaveLength(0)
  })

  test('marks the string that is asked for', () => {
    const line = draw({ activeStringNo: 4 })
    expect(line.findAll('.here')).toHaveLength(1)
    expect(post(line, 4).find('.here').exists()).toBe(true)
  })

  test('keeps its height when numbers appear', () => {
    const empty = draw({ balancesDb: Array<null>(6).fill(null), provisional: true })
    expect(empty.get('.picture').attributes('height')).toBe(draw().get('.picture').attributes('height'))
  })

  test('says all of it again as a table', () => {
    const rows = draw({ balancesDb: replaced(SOUND.balancesDb, 4, -3.4) })
      .findAll('tbody tr')
      .map((row) => row.findAll('th, td').map((cell) => cell.text()))
    expect(rows[0]).toEqual(['6 E', '\u22120.2 dB', '\u00b10.7 n 3', 'inside'])
    expect(rows[2]).toEqual(['4 D', '\u22123.4 dB', '\u00b10.7 n 4', 'outside'])
  })
})

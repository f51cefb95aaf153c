import { expect, test } from 'vitest'
import { allImports } from '../helpers/sources.ts'

/** Each cycle once, as the path through it; type-only imports count, since readers follow them too. */
function cyclesIn(edges: readonly { from: string; target: string }[]): string[][] {
  const targets = new Map<string, string[]>()
  for (const { from, target } of edges) targets.set(from, [...(targets.get(from) ?? []), target])
  const finished = new Set<string>()
  const cycles: string[][] = []
  const visit = (file: string, trail: string[]) => {
    if (trail.includes(file)) {
      cycles.push([...trail.slice(trail.indexOf(file)), file])
      return
    }
    if (finished.has(file)) return
    for (const target of targets.get(file) ?? []) visit(target, [...trail, file])
    finished.add(file)
  }
  for (const file of targets.keys()) visit(file, [])
  return cycles
}

test('the search finds a cycle and leaves a diamond alone', () => {
  const edge = (pair: string) => ({ from: pair.charAt(0), target: pair.charAt(1) })
  expect(cyclesIn(['ab', 'ac', 'bd', 'cd'].map(edge))).toEqual([])
  expect(cyclesIn(['ab', 'bc', 'cb'].map(edge))).toEqual([['b', 'c', 'b']])
})

test('no file imports itself round a corner', () => {
  const edges = allImports().flatMap(({ from, target }) => (target === undefined ? [] : [{ from, target }]))
  expect(cyclesIn(edges).map((cycle) => cycle.join(' -> '))).toEqual([])
})

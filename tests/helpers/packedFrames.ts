import type { Frame } from '../../src/shared/contract/frames.ts'

/** Frames of a fixture, column by column, each as differences from the frame before: short and readable by a diff. */
export interface PackedFrames {
  count: number
  channels: number
  columns: Record<string, string>
}

const SCALARS = [
  'jackMdb',
  'jackAMdb',
  'clipped',
  'plugged',
  'ringSleeveClosed',
  'tipClosed',
  'currentUa',
  'batteryMv',
] as const
const NULL = 'n'

function numberOf(value: number | boolean | null): number | null {
  return typeof value === 'boolean' ? Number(value) : value
}

/** Differences, with runs of the same one written once: '5*12' is 12 times 5. */
function packColumn(values: (number | null)[]): string {
  let last = 0
  const steps = values.map((value) => {
    if (value === null) return NULL
    const step = value - last
    last = value
    return String(step)
  })
  const runs: string[] = []
  for (let i = 0; i < steps.length;) {
    let n = 1
    while (steps[i + n] === steps[i]) n++
    runs.push(n === 1 ? steps[i]! : `${steps[i]}*${n}`)
    i += n
  }
  return runs.join(' ')
}

function unpackColumn(text: string): (number | null)[] {
  let last = 0
  return text.split(' ').flatMap((run) => {
    const [step, n = '1'] = run.split('*')
    return Array.from({ length: Number(n) }, () => (step === NULL ? null : (last += Number(step))))
  })
}

export function packFrames(frames: readonly Frame[]): PackedFrames {
  const channels = frames[0]!.levelMdb.length
  const columns: Record<string, string> = {}
  for (let i = 0; i < channels; i++) {
    columns[`levelMdb${i}`] = packColumn(frames.map((frame) => frame.levelMdb[i]!))
    columns[`levelAMdb${i}`] = packColumn(frames.map((frame) => frame.levelAMdb[i]!))
  }
  for (const key of SCALARS) columns[key] = packColumn(frames.map((frame) => numberOf(frame[key])))
  return { count: frames.length, channels, columns }
}

export function unpackFrames({ count, channels, columns }: PackedFrames): Frame[] {
  const values = Object.fromEntries(Object.entries(columns).map(([key, text]) => [key, unpackColumn(text)]))
  const said = (key: string, i: number) => {
    const value = values[key]![i]!
    return value === null ? null : value === 1
  }
  return Array.from({ length: count }, (_, i) => ({
    levelMdb: Array.from({ length: channels }, (_unused, channel) => values[`levelMdb${channel}`]![i]!),
    levelAMdb: Array.from({ length: channels }, (_unused, channel) => values[`levelAMdb${channel}`]![i]!),
    jackMdb: values['jackMdb']![i]!,
    jackAMdb: values['jackAMdb']![i]!,
    clipped: values['clipped']![i]!,
    plugged: said('plugged', i),
    ringSleeveClosed: said('ringSleeveClosed', i),
    tipClosed: said('tipClosed', i),
    currentUa: values['currentUa']![i]!,
    batteryMv: values['batteryMv']![i]!,
  }))
}

import type { ChartColors } from '../../composables/useUplot.ts'

export interface StringStroke {
  stroke: string
  width: number
  dash: number[] | undefined
}

/** Wound strings in ink, plain ones quiet; thicker towards the bass, dashed towards the treble. */
const STROKES: Record<number, { isWound: boolean; width: number; dash?: number[] }> = {
  6: { isWound: true, width: 2.4 },
  5: { isWound: true, width: 1.8 },
  4: { isWound: true, width: 1.3 },
  3: { isWound: false, width: 1.8 },
  2: { isWound: false, width: 1.5, dash: [8, 3] },
  1: { isWound: false, width: 1.5, dash: [3, 3] },
}

/** How the trace of a string is drawn: told apart by weight and dash as well as by colour. */
export function stringStroke(stringNo: number | null, isCurrent: boolean, colors: ChartColors): StringStroke {
  const own = stringNo === null ? undefined : STROKES[stringNo]
  if (!own) return { stroke: colors.ink, width: 1.6, dash: undefined }
  const stroke = isCurrent ? colors.action : own.isWound ? colors.ink : colors.quiet
  return { stroke, width: isCurrent ? 2.4 : own.width, dash: own.dash }
}

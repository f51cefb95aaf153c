import type uPlot from 'uplot'
import { formatNumber, levelIn, type LevelUnit } from '../../format.ts'
import type { Pluck } from '../../shared/contract/measured.ts'
import type { ChartColors } from '../../composables/useUplot.ts'

/** Canvas text in the numbers' face, in CSS pixels times the screen's ratio. */
export function numberFont(sizePx: number): string {
  return `${sizePx}px 'JetBrains Mono', ui-monospace, monospace`
}

/** Whole tens of the unit shown, as places on an axis that stays in dBV. */
export function levelSplits(lowDb: number, highDb: number, unit: LevelUnit): number[] {
  const shift = levelIn(0, unit)
  const step = 20
  const splits: number[] = []
  for (let shown = Math.ceil((lowDb + shift) / step) * step; shown - shift <= highDb; shown += step) {
    splits.push(shown - shift)
  }
  return splits
}

export function levelAxis(colors: ChartColors, unit: LevelUnit, lowDb: number, highDb: number): uPlot.Axis {
  return {
    scale: 'y',
    stroke: colors.quiet,
    font: numberFont(12),
    size: 44,
    gap: 6,
    splits: () => levelSplits(lowDb, highDb, unit),
    values: (_, places) => places.map((levelDb) => formatNumber(levelIn(levelDb, unit), 0)),
    grid: { stroke: colors.hairline, width: 1 },
    ticks: { show: false },
  }
}

/** String numbers above the traces, at the onset of every pluck; a dropped one is crossed. */
export function drawOnsets(
  chart: uPlot,
  plucks: readonly Pluck[],
  frameMs: number,
  colors: ChartColors,
  currentStringNo: number | null,
): void {
  const { ctx, bbox } = chart
  const ratio = devicePixelRatio
  const { min, max } = chart.scales.x!
  if (min == null || max == null) return
  ctx.save()
  ctx.font = numberFont(12 * ratio)
  ctx.textAlign = 'center'
  ctx.textBaseline = 'alphabetic'
  ctx.lineWidth = ratio
  let freeFrom = Number.NEGATIVE_INFINITY
  for (const pluck of plucks) {
    const at = (pluck.onsetFrame * frameMs) / 1000
    if (at < min || at > max) continue
    const x = chart.valToPos(at, 'x', true)
    const isCurrent = pluck.stringNo !== null && pluck.stringNo === currentStringNo
    ctx.strokeStyle = colors.edge
    ctx.fillStyle = pluck.dropped ? colors.fail : isCurrent ? colors.action : colors.ink
    ctx.beginPath()
    ctx.moveTo(x, bbox.top)
    ctx.lineTo(x, bbox.top + 6 * ratio)
    ctx.stroke()
    const text = `${pluck.dropped ? '\u00d7' : ''}${pluck.stringNo ?? '?'}`
    const half = ctx.measureText(text).width / 2
    if (x - half < freeFrom) continue
    ctx.fillText(text, x, bbox.top - 4 * ratio)
    freeFrom = x + half + 3 * ratio
  }
  ctx.restore()
}

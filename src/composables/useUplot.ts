import uPlot from 'uplot'
import 'uplot/dist/uPlot.min.css'
import { onBeforeUnmount, onMounted, type Ref } from 'vue'

/** The design tokens that a canvas needs, read when the chart is built. */
export interface ChartColors {
  ink: string
  quiet: string
  hairline: string
  edge: string
  action: string
  panel: string
  fail: string
}

function readColors(): ChartColors {
  const style = getComputedStyle(document.documentElement)
  const read = (name: string) => style.getPropertyValue(name).trim()
  return {
    ink: read('--ink'),
    quiet: read('--quiet'),
    hairline: read('--hairline'),
    edge: read('--edge'),
    action: read('--action'),
    panel: read('--panel'),
    fail: read('--verdict-fail'),
  }
}

export interface UplotChart {
  /** draws the data of `dataOf()` again, at most once a frame of the screen */
  redraw: () => void
  /** builds the chart anew: other series, another unit */
  rebuild: () => void
}

/** One uPlot in an element: follows its size and the theme, redraws at most once a screen frame, cleans up. */
export function useUplot(
  host: Readonly<Ref<HTMLElement | null>>,
  optionsOf: (colors: ChartColors) => Omit<uPlot.Options, 'width' | 'height'>,
  dataOf: () => uPlot.AlignedData,
): UplotChart {
  let chart: uPlot | null = null
  let request = 0
  let resize: ResizeObserver | undefined
  let theme: MutationObserver | undefined

  function sizeOf(element: HTMLElement) {
    return { width: Math.max(60, element.clientWidth), height: Math.max(40, element.clientHeight) }
  }

  function rebuild(): void {
    const element = host.value
    if (!element) return
    chart?.destroy()
    chart = new uPlot({ ...optionsOf(readColors()), ...sizeOf(element) }, dataOf(), element)
  }

  function redraw(): void {
    if (request !== 0) return
    request = requestAnimationFrame(() => {
      request = 0
      const data = dataOf()
      if (chart && chart.series.length !== data.length) rebuild()
      else chart?.setData(data)
    })
  }

  onMounted(() => {
    rebuild()
    const element = host.value
    if (!element) return
    resize = new ResizeObserver(() => chart?.setSize(sizeOf(element)))
    resize.observe(element)
    // Canvas knows no CSS variables: another theme means other colours.
    theme = new MutationObserver(rebuild)
    theme.observe(document.documentElement, { attributes: true, attributeFilter: ['data-theme'] })
    void document.fonts?.ready.then(() => chart?.redraw(false, true))
  })

  onBeforeUnmount(() => {
    cancelAnimationFrame(request)
    resize?.disconnect()
    theme?.disconnect()
    chart?.destroy()
    chart = null
  })

  return { redraw, rebuild }
}

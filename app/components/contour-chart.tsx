import type { EChartsOption } from 'echarts'
import { CustomChart, LineChart } from 'echarts/charts'
import { GridComponent, LegendComponent, TooltipComponent } from 'echarts/components'
import * as echarts from 'echarts/core'
import { CanvasRenderer } from 'echarts/renderers'
import { lazy, type ReactNode, Suspense, useEffect, useMemo, useRef, useState } from 'react'

echarts.use([CanvasRenderer, CustomChart, LineChart, GridComponent, LegendComponent, TooltipComponent])

// Its bare module paths do not load in Node, and a server has no canvas to draw on.
const Chart = lazy(() => import('echarts-for-react/esm/core'))

/** Canvas type falls back silently when a weight has not been loaded yet: wait for the two that charts use. */
function useType(): boolean {
  const [ready, setReady] = useState(false)
  useEffect(() => {
    let here = true
    const weights = [400, 600].map((weight) => document.fonts.load(`${weight} 12px 'Source Sans 3'`))
    Promise.allSettled(weights).then(() => here && setReady(true))
    return () => {
      here = false
    }
  }, [])
  return ready
}

/** Pixels below which axes leave no room for a plot; a page being laid out anew passes through such widths. */
const leastWidth = 200

/**
 * A chart as wide as its place. `draw` gets the width in pixels and returns what to draw and how high; it is called
 * again when the width or `draw` itself changes, so keep it (useCallback). `onHover` and `onPick` get pixels from the chart's top left corner; `onHover` gets null
 * when the pointer leaves. `label` is what a screen reader hears: say what the picture shows.
 */
export function ContourChart({
  draw,
  label,
  onHover,
  onPick,
  waiting = 'Drawing …',
}: {
  draw: (width: number) => { option: EChartsOption; height: number }
  label: string
  onHover?: (at: [x: number, y: number] | null) => void
  onPick?: (at: [x: number, y: number]) => void
  waiting?: ReactNode
}) {
  const frame = useRef<HTMLDivElement>(null)
  const [width, setWidth] = useState(0)
  const ready = useType()
  const handlers = useRef({ onHover, onPick })
  handlers.current = { onHover, onPick }
  useEffect(() => {
    if (!frame.current) return
    const observer = new ResizeObserver(([entry]) => {
      if (entry) setWidth(Math.floor(entry.contentRect.width))
    })
    observer.observe(frame.current)
    return () => observer.disconnect()
  }, [])
  const drawn = useMemo(() => (ready && width >= leastWidth ? draw(width) : null), [draw, ready, width])
  const height = drawn?.height

  function listen(chart: echarts.ECharts) {
    const surface = chart.getZr()
    surface.on('mousemove', (event) => handlers.current.onHover?.([event.offsetX, event.offsetY]))
    surface.on('globalout', () => handlers.current.onHover?.(null))
    surface.on('click', (event) => handlers.current.onPick?.([event.offsetX, event.offsetY]))
  }

  return (
    <div ref={frame} className="min-w-0" style={height === undefined ? { minHeight: '20rem' } : { height }}>
      {drawn ? (
        <Suspense fallback={<p className="text-flint-2">{waiting}</p>}>
          <div role="img" aria-label={label} className={onPick ? 'cursor-crosshair' : ''}>
            <Chart
              key={`${width}x${height}`}
              echarts={echarts}
              option={drawn.option}
              notMerge
              style={{ width, height }}
              opts={{ width, height, devicePixelRatio: Math.max(2, window.devicePixelRatio) }}
              onChartReady={listen}
            />
          </div>
        </Suspense>
      ) : (
        <p className="text-flint-2">{waiting}</p>
      )}
    </div>
  )
}

/** A picture file of a chart, at a size of its own whatever the page shows. Browser only. */
export async function pngOf(option: EChartsOption, width: number, height: number): Promise<Blob> {
  const holder = document.createElement('div')
  const chart = echarts.init(holder, null, { width, height, devicePixelRatio: 2 })
  try {
    chart.setOption(option)
    const canvas = chart.renderToCanvas({ pixelRatio: 2, backgroundColor: '#ffffff' })
    return await new Promise((resolve, reject) =>
      canvas.toBlob(
        (blob) => (blob ? resolve(blob) : reject(new Error('The browser could not make the picture.'))),
        'image/png',
      ),
    )
  } finally {
    chart.dispose()
  }
}

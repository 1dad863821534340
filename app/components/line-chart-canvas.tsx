import type { EChartsOption } from 'echarts'
import { LineChart, ScatterChart } from 'echarts/charts'
import {
  DataZoomComponent,
  GridComponent,
  LegendComponent,
  MarkLineComponent,
  TooltipComponent,
} from 'echarts/components'
import * as echarts from 'echarts/core'
import { LabelLayout } from 'echarts/features'
import { CanvasRenderer } from 'echarts/renderers'
import ReactECharts from 'echarts-for-react/esm/core'

echarts.use([
  LineChart,
  ScatterChart,
  DataZoomComponent,
  GridComponent,
  LegendComponent,
  MarkLineComponent,
  TooltipComponent,
  LabelLayout,
  CanvasRenderer,
])

export interface LineChartCanvasProps {
  option: EChartsOption
  height: number
  /** Called with the share of the whole axis that is shown, 0 to 100. */
  onZoom?: (start: number, end: number) => void
}

interface ZoomEvent {
  start?: number
  end?: number
  batch?: { start: number; end: number }[]
}

export default function LineChartCanvas({ option, height, onZoom }: LineChartCanvasProps) {
  const events = onZoom
    ? {
        datazoom: (event: ZoomEvent) => {
          const { start, end } = event.batch?.[0] ?? event
          if (start !== undefined && end !== undefined) onZoom(start, end)
        },
      }
    : undefined
  // Merged, not replaced: a finer series must not throw the reader's zoom away.
  return <ReactECharts echarts={echarts} option={option} style={{ height }} lazyUpdate onEvents={events} />
}

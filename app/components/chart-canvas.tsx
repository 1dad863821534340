import type { EChartsOption } from 'echarts'
import { LineChart, ScatterChart } from 'echarts/charts'
import { GridComponent, TooltipComponent } from 'echarts/components'
import * as echarts from 'echarts/core'
import { LabelLayout } from 'echarts/features'
import { CanvasRenderer } from 'echarts/renderers'
import ReactECharts from 'echarts-for-react/esm/core'

echarts.use([LineChart, ScatterChart, GridComponent, TooltipComponent, LabelLayout, CanvasRenderer])

export default function ChartCanvas({ option, height }: { option: EChartsOption; height: number }) {
  return <ReactECharts echarts={echarts} option={option} style={{ height }} notMerge lazyUpdate />
}

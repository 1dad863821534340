import type { EChartsOption, SeriesOption } from 'echarts'
import { lazy, Suspense } from 'react'
import { type ChartColours, useChartColours } from './chart-colours'

const LineChartCanvas = lazy(() => import('./line-chart-canvas'))

export interface ChartLine {
  name: string
  /** Instant in milliseconds since 1970, and value; null breaks the line. */
  points: readonly (readonly [number, number | null])[]
  colour: keyof ChartColours
  dashed?: boolean
  /** Draws each reading, for a line with few of them. */
  dots?: boolean
  /** Draws the readings and no line between them. */
  pointsOnly?: boolean
}

/** Something that happened at an instant, drawn at a value or, without one, at the foot of the chart. */
export interface ChartMark {
  at: number
  value: number | null
  word: string
}

/** An upright line through the chart. */
export interface ChartDivider {
  at: number
  word: string
}

export interface LineChartProps {
  /** What the chart shows, in words, for those who do not see it. */
  label: string
  height: number
  lines: readonly ChartLine[]
  marks?: readonly ChartMark[]
  /** Name of the marks in the legend. */
  marksName?: string
  dividers?: readonly ChartDivider[]
  /** Name of the value axis, with its unit. */
  valueName: string
  decimals: number
  /** The whole time axis; without it the data's own extent. */
  span?: { from: number; to: number }
  /** Minutes east of UTC of the clock on the axis: one clock all the year, so that no hour is drawn twice. */
  clockOffset: number
  /** The clock's name, printed under the axis. */
  clockName: string
  /** An instant in words for the tooltip. */
  instant: (at: number) => string
  onZoom?: (from: number, to: number) => void
}

/** Values against time: zoomed by the wheel or the bar below, read by pointing. */
export function LineChart(props: LineChartProps) {
  const colours = useChartColours()
  const { span, onZoom } = props
  const zoomed =
    onZoom && span
      ? (start: number, end: number) => {
          const width = span.to - span.from
          onZoom(span.from + (start / 100) * width, span.from + (end / 100) * width)
        }
      : undefined
  return (
    <figure className="m-0">
      <div role="img" aria-label={props.label} style={{ height: props.height }} className="w-full">
        {colours && (
          <Suspense>
            <LineChartCanvas option={chartOption(props, colours)} height={props.height} onZoom={zoomed} />
          </Suspense>
        )}
      </div>
    </figure>
  )
}

function chartOption(props: LineChartProps, colours: ChartColours): EChartsOption {
  const { lines, marks = [], dividers = [], decimals, span, clockOffset } = props
  const shift = clockOffset * 60_000
  const font = { color: colours.quiet, fontFamily: "'Source Sans 3', sans-serif", fontSize: 13 }
  const series: SeriesOption[] = lines.map((line, index) => ({
    id: line.name,
    name: line.name,
    type: 'line',
    data: line.points.map(([at, value]) => [at + shift, value]),
    showSymbol: line.dots || line.pointsOnly || false,
    symbol: 'circle',
    symbolSize: line.pointsOnly ? 7 : 5,
    connectNulls: false,
    animation: false,
    lineStyle: {
      color: colours[line.colour],
      width: line.pointsOnly ? 0 : 1.5,
      type: line.dashed ? 'dashed' : 'solid',
    },
    itemStyle: { color: colours[line.colour] },
    emphasis: { disabled: true },
    markLine:
      index === 0 && dividers.length > 0
        ? {
            silent: true,
            symbol: 'none',
            animation: false,
            lineStyle: { color: colours.quiet, type: 'dotted', width: 1 },
            label: { ...font, formatter: '{b}', position: 'insideEndTop', fontSize: 12 },
            data: dividers.map((divider) => ({ name: divider.word, xAxis: divider.at + shift })),
          }
        : undefined,
  }))
  if (marks.length > 0) {
    const known = lines.flatMap((line) => line.points.flatMap(([, value]) => (value === null ? [] : [value])))
    const foot = known.length > 0 ? Math.min(...known) : 0
    series.push({
      id: 'marks',
      name: props.marksName ?? 'Status',
      type: 'scatter',
      symbol: 'diamond',
      z: 5,
      symbolSize: 9,
      animation: false,
      itemStyle: { color: colours.warn },
      emphasis: { disabled: true },
      data: marks.map((mark) => ({ value: [mark.at + shift, mark.value ?? foot], name: mark.word })),
    })
  }
  return {
    textStyle: font,
    grid: { left: 62, right: 16, top: 30, bottom: props.onZoom ? 84 : 50 },
    legend:
      series.length > 1
        ? { top: 0, right: 8, textStyle: font, itemWidth: 18, itemHeight: 8 }
        : { show: false },
    xAxis: {
      type: 'time',
      min: span && span.from + shift,
      max: span && span.to + shift,
      name: props.clockName,
      nameLocation: 'middle',
      nameGap: 26,
      nameTextStyle: font,
      axisLabel: { ...font, hideOverlap: true },
      axisLine: { lineStyle: { color: colours.quiet } },
      splitLine: { show: true, lineStyle: { color: colours.rule } },
    },
    yAxis: {
      type: 'value',
      scale: true,
      name: props.valueName,
      nameTextStyle: { ...font, align: 'left', padding: [0, 0, 0, -54] },
      axisLabel: { ...font, formatter: (value: number) => plain(value, decimals) },
      axisLine: { show: true, lineStyle: { color: colours.quiet } },
      splitLine: { lineStyle: { color: colours.rule } },
    },
    // Written by the formatter as text: the page's policy allows no styles out of a string.
    tooltip: {
      trigger: 'axis',
      renderMode: 'richText',
      confine: true,
      backgroundColor: colours.paper,
      borderColor: colours.rule,
      textStyle: { ...font, color: colours.text },
      axisPointer: { lineStyle: { color: colours.quiet } },
      formatter: (items) => tooltip(Array.isArray(items) ? items : [items], props),
    },
    dataZoom: props.onZoom
      ? [
          { type: 'inside', filterMode: 'none', zoomOnMouseWheel: 'ctrl', moveOnMouseWheel: false },
          {
            type: 'slider',
            filterMode: 'none',
            height: 22,
            bottom: 8,
            borderColor: colours.rule,
            fillerColor: `${colours.mark}22`,
            handleStyle: { color: colours.paper, borderColor: colours.mark },
            moveHandleStyle: { color: colours.rule },
            dataBackground: {
              lineStyle: { color: colours.quiet, opacity: 0.5 },
              areaStyle: { opacity: 0 },
            },
            selectedDataBackground: { lineStyle: { color: colours.mark }, areaStyle: { opacity: 0 } },
            textStyle: { ...font, fontSize: 11 },
            showDetail: false,
            brushSelect: false,
          },
        ]
      : undefined,
    useUTC: true,
    series,
  }
}

function plain(value: number, decimals: number): string {
  return value.toFixed(decimals).replace('-', '−')
}

interface TooltipItem {
  seriesName?: string
  seriesType?: string
  name?: string
  value?: unknown
}

function tooltip(items: readonly TooltipItem[], props: LineChartProps): string {
  const first = items[0]?.value as [number, number | null] | undefined
  if (!first) return ''
  const lines = items.map((item) => {
    const [, value] = item.value as [number, number | null]
    if (item.seriesType === 'scatter') return `${item.name}`
    return value === null ? '' : `${item.seriesName}  ${plain(value, props.decimals)}`
  })
  return [props.instant(first[0] - props.clockOffset * 60_000), ...lines].filter(Boolean).join('\n')
}

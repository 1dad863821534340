import type { EChartsOption } from 'echarts'
import type { Vertex } from '~/book/field'
import { formatNumber } from '~/units'
import { type HeadField, headAt } from './field'
import { type FigureTheme, palettes } from './palette'
import { typeFace } from './shapes'

/** A head along a cut; NaN where there is none. */
export interface CutSample {
  distance: number
  x: number
  y: number
  head: number
}

/** Heads at `count` places evenly along the straight line from A to A′, both ends included; distances from A. */
export function cutThrough(field: HeadField, from: Vertex, to: Vertex, count = 401): CutSample[] {
  const length = Math.hypot(to[0] - from[0], to[1] - from[1])
  return Array.from({ length: count }, (_, k) => {
    const share = k / (count - 1)
    const x = from[0] + (to[0] - from[0]) * share
    const y = from[1] + (to[1] - from[1]) * share
    return { distance: share * length, x, y, head: headAt(field, x, y) }
  })
}

export interface CutLine {
  name: string
  samples: readonly { distance: number; level: number | null }[]
  look: 'head' | 'before' | 'ground'
}

/** The chart below the plan: levels against distance along the cut. */
export function cutChart(
  lines: readonly CutLine[],
  {
    unit,
    datum,
    theme,
    fontScale = 1,
  }: { unit: string; datum: string; theme: FigureTheme; fontScale?: number },
): EChartsOption {
  const palette = palettes[theme]
  const type = { fontFamily: typeFace, fontSize: 12 * fontScale, color: palette.ink }
  const looks = {
    head: { color: palette.water, width: 2.4, type: 'solid' as const },
    before: { color: palette.water, width: 1.5, type: [6, 4] },
    ground: { color: palette.flux, width: 1.4, type: [10, 3, 2, 3] },
  }
  const axis = {
    axisLabel: { ...type, color: palette.quiet },
    nameTextStyle: { ...type, color: palette.quiet },
    axisLine: { show: true, onZero: false, lineStyle: { color: palette.ink } },
    axisTick: { show: true, lineStyle: { color: palette.ink } },
    splitLine: { lineStyle: { color: palette.rule, opacity: 0.5 } },
  }
  const length = lines[0]?.samples.at(-1)?.distance ?? 0
  return {
    animation: false,
    textStyle: { fontFamily: typeFace },
    grid: { left: 52 * fontScale, right: 16, top: 44 * fontScale, bottom: 44 * fontScale },
    legend: {
      top: 0,
      left: 0,
      itemWidth: 30,
      itemHeight: 0,
      textStyle: type,
      data: lines.map((line) => line.name),
      selectedMode: false,
    },
    tooltip: {
      trigger: 'axis',
      renderMode: 'richText',
      backgroundColor: palette.paper,
      borderColor: palette.rule,
      textStyle: type,
      axisPointer: { lineStyle: { color: palette.alarm } },
      formatter: (items: unknown) => {
        const points = items as { seriesName: string; value: [number, number | null] }[]
        const at = points[0]
        return [
          ...(at ? [`${formatNumber(at.value[0])} ${unit} from A`] : []),
          ...points.map(({ seriesName, value }) => `${seriesName}: ${formatNumber(value[1], 2)} ${unit}`),
        ].join('\n')
      },
    },
    xAxis: {
      type: 'value',
      min: 0,
      max: length,
      name: `Distance from A to A′, ${unit}`,
      nameLocation: 'middle',
      nameGap: 26 * fontScale,
      ...axis,
      axisLabel: {
        ...axis.axisLabel,
        showMaxLabel: false,
        formatter: (value: number) => formatNumber(value),
      },
    },
    yAxis: {
      type: 'value',
      scale: true,
      name: `Level, ${datum}`,
      nameLocation: 'end',
      nameGap: 8,
      ...axis,
      nameTextStyle: { ...type, color: palette.quiet, align: 'left', padding: [0, 0, 0, -44 * fontScale] },
      axisLabel: { ...axis.axisLabel, formatter: (value: number) => formatNumber(value) },
    },
    series: lines.map((line) => ({
      type: 'line' as const,
      name: line.name,
      symbol: 'none',
      data: line.samples.map(({ distance, level }) => [distance, level]),
      lineStyle: looks[line.look],
      itemStyle: { color: looks[line.look].color },
    })),
  }
}

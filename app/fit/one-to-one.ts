import type { EChartsOption } from 'echarts'
import type { Palette } from '~/heads/palette'
import { typeFace } from '~/heads/shapes'
import { formatNumber } from '~/units'

export interface OneToOnePoint {
  name: string
  measured: number
  modelled: number
}

/** Both axes of a 1:1 plot run over the same round range, so that the line of agreement is the diagonal. */
function sharedRange(points: readonly OneToOnePoint[]): { low: number; high: number; step: number } {
  const values = points.flatMap((p) => [p.measured, p.modelled])
  const lowest = Math.min(...values)
  const highest = Math.max(...values)
  const span = Math.max(highest - lowest, 1e-6)
  const rough = span / 5
  const power = 10 ** Math.floor(Math.log10(rough))
  const step = ([1, 2, 5, 10].find((n) => n * power >= rough) ?? 10) * power
  const low = Math.floor((lowest - 0.04 * span) / step) * step
  const high = Math.ceil((highest + 0.04 * span) / step) * step
  return { low, high, step }
}

/** Modelled against measured heads with the line of agreement; the same figure on the page and in the PDF. */
export function oneToOnePlot(
  points: readonly OneToOnePoint[],
  unit: string,
  colours: Palette,
  fontSize = 12,
): EChartsOption {
  const { low, high, step } = sharedRange(points)
  const decimals = Math.max(0, -Math.floor(Math.log10(step)))
  const axis = (name: string) => ({
    type: 'value' as const,
    name: `${name}, ${unit}`,
    nameLocation: 'middle' as const,
    nameTextStyle: { color: colours.quiet, fontSize },
    min: low,
    max: high,
    interval: step,
    axisLine: { show: true, onZero: false, lineStyle: { color: colours.quiet } },
    axisLabel: {
      color: colours.quiet,
      fontSize,
      formatter: (value: number) => formatNumber(value, decimals),
    },
    splitLine: { lineStyle: { color: colours.rule } },
  })
  return {
    animation: false,
    backgroundColor: colours.paper,
    textStyle: { fontFamily: typeFace, color: colours.ink },
    grid: { left: 64, right: 24, top: 16, bottom: 52 },
    tooltip: {
      trigger: 'item',
      renderMode: 'richText',
      formatter: (item: unknown) => {
        const { data } = item as { data: { name: string; value: [number, number] } }
        const [measured, modelled] = data.value
        return `${data.name}\nmeasured ${formatNumber(measured, 2)}\nmodelled ${formatNumber(modelled, 2)}\nresidual ${formatNumber(measured - modelled, 2)}`
      },
    },
    xAxis: { ...axis('Measured head'), nameGap: 30 },
    yAxis: { ...axis('Modelled head'), nameGap: 44 },
    series: [
      {
        type: 'line',
        data: [
          [low, low],
          [high, high],
        ],
        symbol: 'none',
        silent: true,
        lineStyle: { color: colours.quiet, width: 1, type: 'dashed' },
      },
      {
        type: 'scatter',
        symbolSize: 9,
        itemStyle: { color: colours.water },
        label: {
          show: points.length <= 25,
          formatter: (item: unknown) => (item as { data: { name: string } }).data.name,
          position: 'right',
          color: colours.ink,
          fontSize,
        },
        labelLayout: { hideOverlap: true },
        data: points.map((p) => ({ name: p.name, value: [p.measured, p.modelled] })),
      },
    ],
  }
}

import { ScatterChart } from 'echarts/charts'
import { use } from 'echarts/core'
import { LabelLayout } from 'echarts/features'
import { useCallback } from 'react'
import { useChartTheme } from '~/components/chart-colours'
import { ContourChart } from '~/components/contour-chart'
import { palettes } from '~/heads/palette'
import { type OneToOnePoint, oneToOnePlot } from './one-to-one'

use([ScatterChart, LabelLayout])

/** The 1:1 plot on the page; the sheet above it holds the same figures in words. */
export default function OneToOneFigure({ points, unit }: { points: readonly OneToOnePoint[]; unit: string }) {
  const theme = useChartTheme()
  const draw = useCallback(
    (width: number) => ({
      option: oneToOnePlot(points, unit, palettes[theme], 13),
      height: Math.min(440, Math.max(300, Math.round(width * 0.8))),
    }),
    [points, unit, theme],
  )
  return (
    <ContourChart
      draw={draw}
      label={`Modelled against measured heads of ${points.length} instruments; the sheet holds the figures`}
    />
  )
}

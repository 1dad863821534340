import { LineChart, ScatterChart } from 'echarts/charts'
import { GridComponent, TooltipComponent } from 'echarts/components'
import { init, use } from 'echarts/core'
import { LabelLayout } from 'echarts/features'
import { SVGRenderer } from 'echarts/renderers'
import { oneToOnePlot } from '~/fit/one-to-one'
import { drawdownBetween, type HeadField } from '~/heads/field'
import { palettes } from '~/heads/palette'
import {
  contouringOf,
  headsPictureSvg,
  type PictureFeatures,
  type PictureInput,
  pictureLayout,
  type ResidualMark,
} from '~/heads/picture'
import { levelUnit } from '~/projects/project'
import { formatNumber, formatSigned } from '~/units'
import type { GatheredContent } from './gathered'

use([LineChart, ScatterChart, GridComponent, TooltipComponent, LabelLayout, SVGRenderer])

export interface DrawnFigure {
  svg: string
  /** Height over width. */
  ratio: number
  caption: string
}

const width = 900

/** Heads of the run of record with everything that shaped them. */
export function headsFigure(content: GatheredContent, field: HeadField): DrawnFigure {
  return draw(content, { ...field, field: 'head' })
}

/** Drawdown: head of the other run less head of the run of record. */
export function drawdownFigure(content: GatheredContent, now: HeadField, before: HeadField): DrawnFigure {
  return draw(content, { ...drawdownBetween(now, before), field: 'drawdown' })
}

/** Residuals at their instruments, over the quiet heads. Null when nothing was compared. */
export function residualFigure(content: GatheredContent, field: HeadField): DrawnFigure | null {
  const marks = content.fit.lines.flatMap((line): ResidualMark[] => {
    const instrument = content.instruments.find((i) => i.name === line.name)
    if (!instrument || line.residual === null) return []
    const { x, y } = instrument
    return [{ name: line.name, x, y, value: line.residual, label: formatSigned(line.residual, 2) }]
  })
  if (marks.length === 0) return null
  return draw(content, { ...field, field: 'residual', residuals: marks })
}

function draw(
  content: GatheredContent,
  drawn: HeadField & Pick<PictureInput, 'field' | 'residuals'>,
): DrawnFigure {
  const { units, verticalDatum } = content.project
  const input: PictureInput = {
    ...drawn,
    features: featuresOf(content, drawn.field === 'residual'),
    unit: units.length,
    datum: levelUnit(units.length, verticalDatum),
    converged: content.run.result.converged,
  }
  const options = { width, theme: 'print' as const, fontScale: 1.25 }
  const layout = pictureLayout(input, options)
  const contouring = contouringOf(input)
  return {
    svg: headsPictureSvg(input, options),
    ratio: layout.height / layout.width,
    caption: contouring
      ? `Contours every ${formatNumber(contouring.interval)} ${units.length}. Circled crosses: wells; triangles: instruments; hatched line: cut-off wall.`
      : 'No cell has a head.',
  }
}

function featuresOf(content: GatheredContent, withoutInstruments: boolean): PictureFeatures {
  const named = new Set(content.instruments.map((instrument) => instrument.pointId))
  const instruments = content.instruments.map(({ name, x, y }) => ({
    name,
    x,
    y,
    kind: 'instrument' as const,
  }))
  const points = content.points
    .filter((point) => !named.has(point.id))
    .map(({ name, x, y }) => ({ name, x, y, kind: 'point' as const }))
  return {
    wells: content.wells.map(({ name, x, y, kind }) => ({ name, x, y, kind })),
    rechargeZones: content.rechargeZones.map(({ name, polygon }) => ({ name, polygon })),
    boundaries: content.boundaries.map(({ name, kind, line }) => ({ name, kind, line })),
    walls: content.walls.map(({ name, line }) => ({ name, line })),
    points: withoutInstruments ? [] : [...instruments, ...points],
    rings: [],
    noFlowEdges: content.run.result.noFlowEdges,
  }
}

/** Modelled against measured, or null when fewer than two were compared. */
export function oneToOneFigure(content: GatheredContent): DrawnFigure | null {
  const points = content.fit.lines.flatMap(({ name, measured, modelled }) =>
    measured === null || modelled === null ? [] : [{ name, measured, modelled }],
  )
  if (points.length < 2) return null
  const height = 520
  const chart = init(null, null, { renderer: 'svg', ssr: true, width: 720, height })
  chart.setOption(oneToOnePlot(points, content.project.units.length, palettes.print, 15))
  const svg = chart.renderToSVGString()
  chart.dispose()
  return {
    svg,
    ratio: height / 720,
    caption: 'Modelled against measured heads; on the dashed line they agree.',
  }
}

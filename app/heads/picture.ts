import type { EChartsOption } from 'echarts'
import { CustomChart } from 'echarts/charts'
import { init, use } from 'echarts/core'
import { SVGRenderer } from 'echarts/renderers'
import type { Vertex } from '~/book/field'
import { formatNumber } from '~/units'
import { type Box, boxAlong, boxOf, cornersOf, typeWidth } from './boxes'
import {
  type Contour,
  contoursOf,
  decimalsOf,
  intervalFor,
  levelsBetween,
  outlineOfOutside,
  outsideCells,
} from './contours'
import { type HeadField, headAt, rangeOf } from './field'
import { labelsAlong, nameAlong, nameBeside, nameInside, type Taken } from './labels'
import { type FigureSize, type KeyItem, type Layout, layoutOf, scaleBarLength, ticksOf } from './layout'
import { clippedLine, clippedPolygon, hatchOf, lengthsAlong, partOf, pathOf, simplified } from './lines'
import { type FigureTheme, inTheme, type Palette, palettes } from './palette'
import { drawdownColour, headColour, lineOn, type Oklch, residualColour, toHex, typeOn } from './ramp'
import {
  cased,
  drawn,
  filled,
  group,
  pathOfBox,
  pathOfCircle,
  pathOfRectangle,
  type Shape,
  type,
  typeFace,
} from './shapes'
import {
  type BoundaryLook,
  boundarySymbol,
  levelSymbol,
  noFlowSymbol,
  pointSymbol,
  symbolReach,
  wallSymbol,
  wellSymbol,
} from './symbols'

use([CustomChart, SVGRenderer])

/** What is drawn over the field; coordinates in the units of its edges. */
export interface PictureFeatures {
  wells: { name: string; x: number; y: number; kind: 'abstraction' | 'recharge' }[]
  /** A zone without a polygon acts everywhere and is not hatched. */
  rechargeZones: { name: string; polygon: readonly Vertex[] | null }[]
  boundaries: {
    name: string
    kind: BoundaryLook
    line?: readonly Vertex[]
    polygon?: readonly Vertex[]
  }[]
  walls: { name: string; line: readonly Vertex[] }[]
  points: { name: string; x: number; y: number; kind: 'instrument' | 'point' }[]
  rings: { name: string; polygon: readonly Vertex[] }[]
  /** Sides of the extent across which nothing flows: "north", "east", "south", "west". */
  noFlowEdges: readonly string[]
}

/** A residual (measured - modelled) to mark on a plan. */
export interface ResidualMark {
  name: string
  x: number
  y: number
  value: number
  /** The value as printed, with its sign. */
  label: string
}

export interface PictureInput extends HeadField {
  /** What `heads` holds. With 'residual' it holds heads, drawn quietly under the marks. */
  field: 'head' | 'drawdown' | 'residual'
  features: PictureFeatures
  residuals?: readonly ResidualMark[]
  /** Unit of coordinates and values, as printed. */
  unit: string
  /** What levels are measured from: "m above site datum". */
  datum: string
  /** False prints across the figure that the run did not converge. */
  converged: boolean
  /** Printed below the figure; pages that print their own caption leave it out. */
  caption?: string
}

export interface PictureOptions extends FigureSize {
  theme: FigureTheme
  /** Contour interval in `unit`; left out or unusable: automatic. */
  interval?: number
  /** A cut to mark, from A to A′, or only its first end. */
  cut?: readonly Vertex[]
  /** A place to ring: what is selected beside the figure. */
  selected?: Vertex
}

/** The contours that a picture of a field shows. */
export interface Contouring {
  low: number
  high: number
  interval: number
  levels: number[]
  decimals: number
}

/** Interval and levels for a field; null when it holds no value at all. */
export function contouringOf(
  input: Pick<PictureInput, 'xEdges' | 'yEdges' | 'heads' | 'field'>,
  asked?: number,
): Contouring | null {
  const range = rangeOf(input)
  if (!range) return null
  const { low, high } = range
  const interval = intervalFor(low, high, asked)
  // Where nothing is drawn down, rounding must not draw a ragged contour of zero.
  const calm = input.field === 'drawdown' && Math.abs(low) < interval / 50 ? Math.max(low, 0) : low
  const levels = levelsBetween(calm, high, interval)
  return { low, high, interval, levels, decimals: decimalsOf(interval) }
}

interface Drawing {
  input: PictureInput
  options: PictureOptions
  layout: Layout
  palette: Palette
  contouring: Contouring | null
  /** Colours of the bands, from below the lowest level to above the highest. */
  bands: Oklch[]
  taken: Taken
}

/** Where everything stands in the picture that `headsPicture` draws with the same arguments. */
export function pictureLayout(input: PictureInput, options: PictureOptions): Layout {
  return layoutOf(input, options, keyItemsOf(input), input.caption)
}

/**
 * The figure of a field as an ECharts option: filled contours with labels, and over them boundaries, walls, recharge
 * zones, wells and instruments; axes in the project's coordinates, scale bar, north arrow, legend and key. One scale in
 * both directions. The same for page and PDF: nothing in it needs a pattern, a clipping path or measured type.
 */
export function headsPicture(input: PictureInput, options: PictureOptions): EChartsOption {
  const layers = layersOf(input, options)
  return {
    animation: false,
    textStyle: { fontFamily: typeFace },
    series: [
      {
        type: 'custom',
        coordinateSystem: 'none',
        silent: true,
        data: layers.map((_, index) => [index]),
        renderItem: (item: { dataIndex: number }) => layers[item.dataIndex] as never,
      },
    ],
  } as EChartsOption
}

/** The figure as an SVG document, drawn without a browser. Type is set in Source Sans 3; colours are six-digit hex. */
export function headsPictureSvg(input: PictureInput, options: PictureOptions): string {
  const { width, height } = pictureLayout(input, options)
  const chart = init(null, null, { renderer: 'svg', ssr: true, width, height })
  chart.setOption(headsPicture(input, options))
  const svg = chart.renderToSVGString()
  chart.dispose()
  return svg
}

// Tracing takes most of the time, and a change of width, colours or cut needs none of it.
const traced = new WeakMap<Float64Array, { levels: string; contours: Contour[] }>()

function tracedContours(input: PictureInput, levels: readonly number[]): Contour[] {
  const key = levels.join(' ')
  const before = traced.get(input.heads)
  if (before?.levels === key) return before.contours
  const contours = contoursOf(input, levels)
  traced.set(input.heads, { levels: key, contours })
  return contours
}

function layersOf(input: PictureInput, options: PictureOptions): Shape[] {
  const layout = pictureLayout(input, options)
  const palette = palettes[options.theme]
  const contouring = contouringOf(input, options.interval)
  const drawing: Drawing = {
    input,
    options,
    layout,
    palette,
    contouring,
    bands: contouring ? bandsOf(contouring, input.field, options.theme) : [],
    taken: [],
  }
  const contours = contouring ? tracedContours(input, contouring.levels) : []
  reserve(drawing)
  const names = namesOf(drawing)
  const lines = contourLines(drawing, contours)
  return [
    group([filled(pathOfRectangle(0, 0, layout.width, layout.height), palette.paper)]),
    group(fillsOf(drawing, contours)),
    group(lines.lines),
    group(outsideOf(drawing)),
    group(rechargeOf(drawing)),
    group(gridCrosses(drawing)),
    group(frameOf(drawing)),
    group(linesOf(drawing)),
    group(cutLine(drawing)),
    group(lines.labels),
    group(symbolsOf(drawing)),
    group(residualsOf(drawing)),
    group(selectionOf(drawing)),
    group(names),
    group(cutEnds(drawing)),
    group(scaleOf(drawing)),
    group(legendOf(drawing)),
    group(keysOf(drawing)),
    group(captionOf(drawing)),
    group(input.converged ? [] : watermarkOf(drawing)),
  ].filter((layer) => layer.children.length > 0)
}

function bandsOf(
  { low, high, levels, interval }: Contouring,
  field: PictureInput['field'],
  theme: FigureTheme,
): Oklch[] {
  const count = levels.length + 1
  const largest = Math.max(Math.abs(low), Math.abs(high), interval)
  return Array.from({ length: count }, (_, k) => {
    if (field === 'residual') return inTheme({ l: 0.965, c: 0.012, h: 200 }, theme)
    if (field === 'drawdown') {
      const from = k === 0 ? Math.min((levels[0] ?? 0) - interval, high) : (levels[k - 1] as number)
      const middle = levels.length === 0 ? (low + high) / 2 : from + interval / 2
      return inTheme(drawdownColour(middle / largest), theme)
    }
    return inTheme(headColour(count === 1 ? 0.5 : k / (count - 1)), theme)
  })
}

function pixelLine(layout: Layout, line: readonly Vertex[]): Vertex[] {
  return line.map(([x, y]) => layout.toPixel(x, y))
}

function fillsOf({ layout, bands, palette }: Drawing, contours: readonly Contour[]): Shape[] {
  const { plot } = layout
  const whole = pathOfRectangle(plot.left, plot.top, plot.width, plot.height)
  const base = bands[0]
  if (!base) return [filled(whole, palette.paper)]
  // Rings close along the plot's edge, so each level is painted over the one below, the lowest band being the base.
  const fills = [filled(whole, toHex(base))]
  for (const [k, contour] of contours.entries()) {
    const data = contour.area
      .flat()
      .map((ring) => pathOf(simplified(pixelLine(layout, ring), 0.12), true))
      .join('')
    if (data !== '') fills.push(filled(data, toHex(bands[k + 1] as Oklch)))
  }
  return fills
}

/** Every so many contours one is drawn heavier: each fifth, or fourth where that makes a rounder number. */
function isIndex(level: number, interval: number): boolean {
  const mantissa = interval / 10 ** Math.floor(Math.log10(interval) + 1e-9)
  const every = Math.abs(mantissa - 2.5) < 1e-6 ? 4 : 5
  return Math.round(level / interval) % every === 0
}

function contourLines(drawing: Drawing, contours: readonly Contour[]): { lines: Shape[]; labels: Shape[] } {
  const { input, layout, bands, contouring, taken, palette } = drawing
  const lines: Shape[] = []
  const labels: Shape[] = []
  if (!contouring) return { lines, labels }
  const { interval, decimals } = contouring
  const size = layout.size
  const quiet = input.field === 'residual'
  const inOrder = contours
    .map((contour, k) => ({ contour, k, index: isIndex(contour.level, interval) }))
    .sort((a, b) => Number(b.index) - Number(a.index))
  for (const { contour, k, index } of inOrder) {
    const below = bands[k] as Oklch
    const above = bands[k + 1] as Oklch
    const fill: Oklch = { l: (below.l + above.l) / 2, c: (below.c + above.c) / 2, h: above.h }
    const colour = toHex(
      quiet ? { l: drawing.options.theme === 'dark' ? 0.5 : 0.72, c: 0.03, h: 215 } : lineOn(fill),
    )
    const width = (index ? 1.7 : 0.9) * Math.sqrt(size)
    const suits = (box: Box) =>
      cornersOf(box).every(([x, y]) => {
        const value = headAt(input, ...layout.toGround(x, y))
        return Math.abs(value - contour.level) < interval * 0.8
      })
    let data = ''
    for (const line of [...contour.lines].sort((a, b) => b.length - a.length)) {
      const pixels = pixelLine(layout, line)
      const placed = labelsAlong(pixels, {
        text: formatNumber(contour.level, decimals),
        size: 11.5 * size,
        plot: inset(layout.plot, 3),
        taken,
        suits,
      })
      for (const { box, text } of placed) {
        labels.push(
          filled(pathOfBox({ ...box, height: box.height * 0.86 }), toHex(fill)),
          type(box.x, box.y, text, {
            fill: quiet ? palette.quiet : toHex(typeOn(fill)),
            size: 11.5 * size,
            weight: 600,
            align: 'center',
            angle: box.angle,
          }),
        )
      }
      data += simplifiedGaps(pixels, placed)
    }
    if (data !== '') lines.push(drawn(data, colour, width))
  }
  return { lines, labels }
}

/** Path data of a line broken at its labels. */
function simplifiedGaps(line: readonly Vertex[], labels: readonly { from: number; to: number }[]): string {
  if (labels.length === 0) return pathOf(simplified(line, 0.12))
  const lengths = lengthsAlong(line)
  const gaps = [...labels].sort((a, b) => a.from - b.from)
  let from = 0
  let data = ''
  for (const gap of gaps) {
    data += pathOf(simplified(partOf(line, lengths, from, gap.from), 0.12))
    from = gap.to
  }
  return data + pathOf(simplified(partOf(line, lengths, from, lengths.at(-1) as number), 0.12))
}

function inset({ left, top, width, height }: Layout['plot'], by: number): Layout['plot'] {
  return { left: left + by, top: top + by, width: width - 2 * by, height: height - 2 * by }
}

/** Where the model has no head the figure shows paper, outlined. */
function outsideOf({ input, layout, palette }: Drawing): Shape[] {
  const cells = outsideCells(input)
  if (cells.length === 0) return []
  const boxes = cells
    .map(({ x, y }) => {
      const [left, top] = layout.toPixel(x[0], y[1])
      const [right, bottom] = layout.toPixel(x[1], y[0])
      return pathOfRectangle(left, top, right - left, bottom - top)
    })
    .join('')
  const outline = outlineOfOutside(input)
    .map((piece) => pathOf(pixelLine(layout, piece)))
    .join('')
  // A hairline of its own colour closes the seams between rows of cells.
  return [
    filled(boxes, palette.paper),
    drawn(boxes, palette.paper, 0.6),
    drawn(outline, palette.ink, 1.1 * layout.size, { lineCap: 'square' }),
  ]
}

function rechargeOf({ input, layout, palette, bands, contouring }: Drawing): Shape[] {
  const shapes: Shape[] = []
  for (const { polygon } of input.features.rechargeZones) {
    if (!polygon) continue
    const ring = clippedPolygon(pixelLine(layout, polygon), layout.plot)
    if (ring.length < 3) continue
    const fill = bandAt(ring, { input, layout, bands, contouring })
    const ink =
      fill && fill.l < 0.6 ? toHex({ l: 0.9, c: 0.03, h: 210 }) : toHex({ l: 0.36, c: 0.07, h: 225 })
    const hatch = hatchOf(ring, 8 * layout.size)
      .map((line) => pathOf(line))
      .join('')
    shapes.push(
      drawn(hatch, ink, 0.9, { strokeOpacity: 0.6, lineCap: 'butt' }),
      drawn(pathOf(ring, true), palette.casing, 2.6, { strokeOpacity: 0.6 }),
      drawn(pathOf(ring, true), ink, 1.3 * layout.size, { lineDash: [6, 4], lineCap: 'butt' }),
    )
  }
  return shapes
}

function bandAt(
  ring: readonly Vertex[],
  { input, layout, bands, contouring }: Pick<Drawing, 'input' | 'layout' | 'bands' | 'contouring'>,
): Oklch | undefined {
  const x = ring.reduce((sum, vertex) => sum + vertex[0], 0) / ring.length
  const y = ring.reduce((sum, vertex) => sum + vertex[1], 0) / ring.length
  const value = headAt(input, ...layout.toGround(x, y))
  if (!contouring || Number.isNaN(value)) return undefined
  return bands[contouring.levels.filter((level) => level <= value).length]
}

/** Small crosses where the coordinate lines meet, so that places can be read off without a net of lines. */
function gridCrosses({ input, layout, palette }: Drawing): Shape[] {
  const { x, y } = axesOf(input, layout)
  let data = ''
  for (const east of x.ticks) {
    for (const north of y.ticks) {
      const [px, py] = layout.toPixel(east, north)
      const { left, top, width, height } = layout.plot
      if (px < left + 8 || px > left + width - 8 || py < top + 8 || py > top + height - 8) continue
      data += `M${px - 3.5} ${py}H${px + 3.5}M${px} ${py - 3.5}V${py + 3.5}`
    }
  }
  return data === '' ? [] : [drawn(data, palette.edge, 0.8, { strokeOpacity: 0.5, lineCap: 'butt' })]
}

function axesOf({ xEdges, yEdges }: HeadField, layout: Layout) {
  return {
    x: ticksOf(xEdges[0] as number, xEdges.at(-1) as number, layout.scale, 92 * layout.size),
    y: ticksOf(yEdges[0] as number, yEdges.at(-1) as number, layout.scale, 76 * layout.size),
  }
}

function boundaryLines({ layout }: Drawing, boundary: PictureFeatures['boundaries'][number]): Vertex[][] {
  const closed = boundary.polygon ? [...boundary.polygon, boundary.polygon[0] as Vertex] : boundary.line
  return closed ? clippedLine(pixelLine(layout, closed), layout.plot) : []
}

function linesOf(drawing: Drawing): Shape[] {
  const { input, layout, palette } = drawing
  const { plot, size } = layout
  const middle: Vertex = [plot.left + plot.width / 2, plot.top + plot.height / 2]
  const rings = input.features.rings.flatMap(({ polygon }) =>
    clippedLine(pixelLine(layout, [...polygon, polygon[0] as Vertex]), plot).flatMap((line) =>
      cased(pathOf(line), palette.alarm, 1.5 * size, palette.casing, {
        lineDash: [9 * size, 3 * size, 2 * size, 3 * size],
        lineCap: 'butt',
      }),
    ),
  )
  return [
    ...input.features.boundaries.flatMap((boundary) =>
      boundaryLines(drawing, boundary).flatMap((line) =>
        boundarySymbol(line, boundary.kind, size, palette, middle),
      ),
    ),
    ...rings,
    ...input.features.walls.flatMap(({ line }) =>
      clippedLine(pixelLine(layout, line), plot).flatMap((part) => wallSymbol(part, size, palette)),
    ),
  ]
}

function isInPlot({ plot }: Layout, [x, y]: Vertex): boolean {
  return x >= plot.left && x <= plot.left + plot.width && y >= plot.top && y <= plot.top + plot.height
}

function symbolsOf({ input, layout, palette }: Drawing): Shape[] {
  const { wells, points } = input.features
  const here = <Placed extends { x: number; y: number }>(placed: readonly Placed[]) =>
    placed
      .map((feature) => ({ feature, at: layout.toPixel(feature.x, feature.y) }))
      .filter(({ at }) => isInPlot(layout, at))
  const marked = new Set(input.residuals?.map((mark) => mark.name))
  return [
    ...here(points.filter((point) => !marked.has(point.name))).flatMap(({ feature, at }) =>
      feature.kind === 'instrument'
        ? levelSymbol(at[0], at[1], layout.size, palette)
        : pointSymbol(at[0], at[1], layout.size, palette),
    ),
    ...here(wells).flatMap(({ feature, at }) => wellSymbol(at[0], at[1], feature.kind, layout.size, palette)),
  ]
}

function residualRadius(value: number, largest: number, size: number): number {
  return (4.5 + 9 * Math.sqrt(Math.abs(value) / largest)) * size
}

function largestResidual(marks: readonly ResidualMark[]): number {
  return Math.max(1e-12, ...marks.map(({ value }) => Math.abs(value)))
}

function residualsOf({ input, layout, palette, options }: Drawing): Shape[] {
  const marks = input.residuals ?? []
  const largest = largestResidual(marks)
  return marks.flatMap(({ x, y, value }) => {
    const at = layout.toPixel(x, y)
    if (!isInPlot(layout, at)) return []
    const circle = pathOfCircle(at[0], at[1], residualRadius(value, largest, layout.size))
    return [
      drawn(circle, palette.face, 3.4 * layout.size),
      filled(circle, toHex(inTheme(residualColour(value / largest), options.theme))),
      drawn(circle, palette.edge, 1.3 * layout.size),
    ]
  })
}

/** Takes the room of symbols and lines, so that no label lands on them. */
function reserve(drawing: Drawing): void {
  const { input, layout, taken } = drawing
  const { size } = layout
  const square = 2 * symbolReach * size + 2
  for (const { x, y } of input.features.wells) taken.push(boxOf(...layout.toPixel(x, y), square, square))
  for (const { x, y } of input.features.points) {
    const [px, py] = layout.toPixel(x, y)
    taken.push(boxOf(px, py - 3 * size, square, square))
  }
  const marks = input.residuals ?? []
  const largest = largestResidual(marks)
  for (const { x, y, value } of marks) {
    const across = 2 * residualRadius(value, largest, size) + 2
    taken.push(boxOf(...layout.toPixel(x, y), across, across))
  }
  const lines = [
    ...input.features.boundaries.flatMap((boundary) =>
      boundaryLines(drawing, boundary).map((line) => ({ line, width: 9 })),
    ),
    ...input.features.walls.flatMap(({ line }) =>
      clippedLine(pixelLine(layout, line), layout.plot).map((part) => ({ line: part, width: 15 })),
    ),
    ...input.features.rings.flatMap(({ polygon }) =>
      clippedLine(pixelLine(layout, [...polygon, polygon[0] as Vertex]), layout.plot).map((part) => ({
        line: part,
        width: 6,
      })),
    ),
  ]
  for (const { line, width } of lines) {
    const pieces = simplified(line, 1)
    for (let k = 1; k < pieces.length; k++) {
      taken.push(boxAlong(pieces[k - 1] as Vertex, pieces[k] as Vertex, width * size))
    }
  }
  const cut = pixelLine(layout, drawing.options.cut ?? [])
  for (const [x, y] of cut) taken.push(boxOf(x, y, 24 * size, 24 * size))
  if (cut[0] && cut[1]) taken.push(boxAlong(cut[0], cut[1], 4 * size))
}

/** Names of everything drawn, each on a slip of paper where it covers least. */
function namesOf(drawing: Drawing): Shape[] {
  const { input, layout, palette, taken } = drawing
  const { features } = input
  const size = 12 * layout.size
  const plot = inset(layout.plot, 2)
  const shapes: Shape[] = []
  const write = (box: Box | undefined, text: string, weight: 400 | 600 = 600, colour = palette.chipInk) => {
    if (!box) return
    shapes.push(
      filled(pathOfBox(box), palette.chip, palette.chipOpacity),
      type(box.x, box.y, text, { fill: colour, size, weight, align: 'center', angle: box.angle }),
    )
  }
  const beside = (x: number, y: number, text: string, clear: number) => {
    const at = layout.toPixel(x, y)
    if (!isInPlot(layout, at)) return
    const { box, leader } = nameBeside(at[0], at[1], text, { size, clear, plot, taken })
    if (leader) shapes.push(...cased(pathOf(leader), palette.line, layout.size, palette.casing))
    write(box, text)
  }
  const marks = input.residuals ?? []
  const largest = largestResidual(marks)
  for (const { name, label, x, y, value } of marks) {
    beside(x, y, `${name} ${label}`, residualRadius(value, largest, layout.size) + 3)
  }
  const clear = (symbolReach + 2.5) * layout.size
  for (const { name, x, y } of features.wells) beside(x, y, name, clear)
  for (const { name, x, y, kind } of features.points) {
    if (marks.some((mark) => mark.name === name)) continue
    // The triangle stands on its point: its middle lies a little higher.
    beside(x, kind === 'instrument' ? y + (3 * layout.size) / layout.scale : y, name, clear)
  }
  for (const { name, line } of features.walls) {
    const longest = longestOf(clippedLine(pixelLine(layout, line), layout.plot))
    if (longest) write(nameAlong(longest, name, { size, clear: 9 * layout.size, plot, taken }), name)
  }
  for (const boundary of features.boundaries) {
    const longest = longestOf(boundaryLines(drawing, boundary))
    if (longest) {
      write(nameAlong(longest, boundary.name, { size, clear: 5 * layout.size, plot, taken }), boundary.name)
    }
  }
  for (const { name, polygon } of features.rings) {
    const longest = longestOf(clippedLine(pixelLine(layout, [...polygon, polygon[0] as Vertex]), layout.plot))
    if (longest) write(nameAlong(longest, name, { size, clear: 4 * layout.size, plot, taken }), name)
  }
  for (const { name, polygon } of features.rechargeZones) {
    if (!polygon) continue
    const ring = clippedPolygon(pixelLine(layout, polygon), layout.plot)
    if (ring.length >= 3) write(nameInside(ring, name, { size, plot, taken }), name)
  }
  return shapes
}

function longestOf(lines: readonly Vertex[][]): Vertex[] | undefined {
  const length = (line: Vertex[]) => lengthsAlong(line).at(-1) ?? 0
  return lines.reduce<Vertex[] | undefined>(
    (longest, line) => (!longest || length(line) > length(longest) ? line : longest),
    undefined,
  )
}

function cutLine({ options, layout, palette }: Drawing): Shape[] {
  const [from, to] = pixelLine(layout, options.cut ?? [])
  if (!from || !to) return []
  return cased(pathOf([from, to]), palette.alarm, 1.8 * layout.size, palette.casing, { lineCap: 'butt' })
}

function cutEnds({ options, layout, palette }: Drawing): Shape[] {
  return pixelLine(layout, options.cut ?? []).flatMap(([x, y], k) => [
    filled(pathOfCircle(x, y, 9 * layout.size), palette.casing),
    drawn(pathOfCircle(x, y, 9 * layout.size), palette.alarm, 1.6 * layout.size),
    type(x, y, k === 0 ? 'A' : 'A′', {
      fill: palette.alarm,
      size: 12 * layout.size,
      weight: 600,
      align: 'center',
    }),
  ])
}

function selectionOf({ options, layout, palette }: Drawing): Shape[] {
  if (!options.selected) return []
  const [x, y] = layout.toPixel(...options.selected)
  return cased(pathOfCircle(x, y, 15 * layout.size), palette.alarm, 2.2 * layout.size, palette.casing)
}

function frameOf({ input, layout, palette }: Drawing): Shape[] {
  const { plot, size } = layout
  const right = plot.left + plot.width
  const bottom = plot.top + plot.height
  const sides: Record<string, [Vertex, Vertex, number]> = {
    north: [[plot.left, plot.top], [right, plot.top], -Math.PI / 2],
    south: [[plot.left, bottom], [right, bottom], Math.PI / 2],
    west: [[plot.left, plot.top], [plot.left, bottom], Math.PI],
    east: [[right, plot.top], [right, bottom], 0],
  }
  const shapes: Shape[] = input.features.noFlowEdges.flatMap((edge) => {
    const side = sides[edge]
    return side ? [noFlowSymbol(side[0], side[1], side[2], size, palette)] : []
  })
  const axes = axesOf(input, layout)
  const style = { fill: palette.quiet, size: 11 * size }
  let ticks = ''
  for (const east of axes.x.ticks) {
    const [x] = layout.toPixel(east, 0)
    ticks += `M${x} ${bottom}V${bottom + 5 * size}`
    const text = formatNumber(east, decimalsOf(axes.x.step))
    const half = typeWidth(text, style.size) / 2
    const at = Math.min(right - half, Math.max(plot.left + half, x))
    shapes.push(type(at, bottom + 13 * size, text, { ...style, align: 'center' }))
  }
  for (const north of axes.y.ticks) {
    const [, y] = layout.toPixel(0, north)
    ticks += `M${plot.left - 5 * size} ${y}H${plot.left}`
    const text = formatNumber(north, decimalsOf(axes.y.step))
    const half = typeWidth(text, style.size) / 2
    const at = Math.min(bottom - half, Math.max(plot.top + half, y))
    shapes.push(type(plot.left - 13 * size, at, text, { ...style, align: 'center', angle: -Math.PI / 2 }))
  }
  shapes.push(
    drawn(ticks, palette.quiet, 1, { lineCap: 'butt' }),
    drawn(pathOfRectangle(plot.left, plot.top, plot.width, plot.height), palette.ink, 1.2, {
      lineJoin: 'miter',
    }),
  )
  return shapes
}

function scaleOf({ input, layout, palette }: Drawing): Shape[] {
  const { size, scale } = layout
  const { left, top, width } = layout.scaleBar
  const arrow = left + 9 * size
  const shapes: Shape[] = [
    filled(
      pathOf(
        [
          [arrow, top],
          [arrow + 6 * size, top + 26 * size],
          [arrow, top + 20 * size],
        ],
        true,
      ),
      palette.ink,
    ),
    drawn(
      pathOf(
        [
          [arrow, top],
          [arrow - 6 * size, top + 26 * size],
          [arrow, top + 20 * size],
          [arrow + 6 * size, top + 26 * size],
        ],
        true,
      ),
      palette.ink,
      1.1,
      { lineJoin: 'miter' },
    ),
    type(arrow, top + 33 * size, 'N', { fill: palette.ink, size: 12 * size, weight: 600, align: 'center' }),
  ]
  const from = left + 36 * size
  const length = scaleBarLength(scale, Math.min(180 * size, width - 80 * size))
  const half = (length * scale) / 2
  const bar = top + 10 * size
  const tall = 5 * size
  shapes.push(
    filled(pathOfRectangle(from, bar, half, tall), palette.ink),
    drawn(pathOfRectangle(from, bar, 2 * half, tall), palette.ink, 1, { lineJoin: 'miter' }),
  )
  const style = { fill: palette.ink, size: 11.5 * size, align: 'center' as const }
  for (const [share, text] of [
    [0, '0'],
    [1, formatNumber(length / 2)],
    [2, formatNumber(length)],
  ] as const) {
    shapes.push(type(from + share * half, bar + tall + 9 * size, text, style))
  }
  shapes.push(
    type(
      from + 2 * half + typeWidth(formatNumber(length), 11.5 * size) / 2 + 4 * size,
      bar + tall + 9 * size,
      input.unit,
      {
        ...style,
        align: 'left',
      },
    ),
  )
  return shapes
}

function legendTitle({ input, contouring }: Drawing): string {
  if (input.field === 'residual') return `Residual = measured − modelled, ${input.unit}`
  const what = input.field === 'drawdown' ? `Drawdown, ${input.unit}` : `Head, ${input.datum}`
  if (!contouring) return what
  const decimals = contouring.decimals + 1
  return `${what}: ${formatNumber(contouring.low, decimals)} to ${formatNumber(contouring.high, decimals)}`
}

function legendOf(drawing: Drawing): Shape[] {
  const { input, layout, palette, bands, contouring, options } = drawing
  const { left, top, width } = layout.legend
  const { size } = layout
  const shapes: Shape[] = [
    type(left, top + 7 * size, legendTitle(drawing), { fill: palette.ink, size: 12 * size, weight: 600 }),
  ]
  const marks = input.residuals ?? []
  const largest = largestResidual(marks)
  const residual = input.field === 'residual'
  const colours = residual
    ? Array.from({ length: 9 }, (_, k) => inTheme(residualColour((k - 4) / 4), options.theme))
    : bands
  if (colours.length === 0) return shapes
  const box = width / colours.length
  const bar = top + 18 * size
  const tall = 13 * size
  for (const [k, colour] of colours.entries()) {
    shapes.push(
      filled(
        pathOfRectangle(left + k * box, bar, box + (k + 1 < colours.length ? 0.4 : 0), tall),
        toHex(colour),
      ),
    )
  }
  shapes.push(drawn(pathOfRectangle(left, bar, width, tall), palette.quiet, 0.9, { lineJoin: 'miter' }))
  const style = { fill: palette.ink, size: 11.5 * size }
  const under = bar + tall + 10 * size
  if (residual) {
    const text = formatNumber(largest, 2)
    shapes.push(
      type(left, under, `−${text} below model`, style),
      type(left + width / 2, under, '0', { ...style, align: 'center' }),
      type(left + width, under, `above model +${text}`, { ...style, align: 'right' }),
    )
    return shapes
  }
  if (!contouring) return shapes
  const { levels, decimals, interval } = contouring
  const texts = levels.map((level) => formatNumber(level, decimals))
  const widest = Math.max(0, ...texts.map((text) => typeWidth(text, style.size))) + 8 * size
  const every = Math.max(1, Math.ceil(widest / box))
  // Labels stand at round multiples, so that a reader can count from one to the next.
  const offset = levels.findIndex((level) => Math.round(level / interval) % every === 0)
  let ticks = ''
  for (const [k, text] of texts.entries()) {
    const x = left + (k + 1) * box
    const labelled = (k - Math.max(0, offset)) % every === 0
    ticks += `M${x} ${bar + tall}V${bar + tall + (labelled ? 4 : 2) * size}`
    if (labelled) shapes.push(type(x, under, text, { ...style, align: 'center' }))
  }
  if (ticks !== '') shapes.push(drawn(ticks, palette.quiet, 0.9, { lineCap: 'butt' }))
  return shapes
}

const boundaryKinds: readonly BoundaryLook[] = [
  'fixed head',
  'head-dependent flux',
  'specified flux',
  'drain',
  'seepage face',
]

function keyItemsOf({ features, residuals, heads }: PictureInput): KeyItem[] {
  const items: KeyItem[] = []
  const add = (present: boolean, name: string, label = name) => {
    if (present) items.push({ name, label })
  }
  add(
    features.wells.some((well) => well.kind === 'abstraction'),
    'abstraction',
    'abstraction well',
  )
  add(
    features.wells.some((well) => well.kind === 'recharge'),
    'recharge',
    'recharge well',
  )
  const marked = new Set(residuals?.map((mark) => mark.name))
  const points = features.points.filter((point) => !marked.has(point.name))
  add(
    points.some((point) => point.kind === 'instrument'),
    'piezometer',
  )
  add(
    points.some((point) => point.kind === 'point'),
    'named point',
  )
  for (const kind of boundaryKinds) {
    add(
      features.boundaries.some((boundary) => boundary.kind === kind),
      kind,
    )
  }
  add(features.walls.length > 0, 'wall', 'cut-off wall')
  add(
    features.rechargeZones.some((zone) => zone.polygon),
    'zone',
    'recharge zone',
  )
  add(features.rings.length > 0, 'ring', 'balance ring')
  add(
    features.noFlowEdges.some((edge) => ['north', 'east', 'south', 'west'].includes(edge)),
    'no flow',
    'no-flow edge',
  )
  add(heads.some(Number.isNaN), 'outside', 'outside the model')
  return items
}

function keysOf({ layout, palette }: Drawing): Shape[] {
  const { size, sampleWidth } = layout
  return layout.keys.flatMap(({ item, x, y }) => {
    const from: Vertex = [x + 1, y]
    const to: Vertex = [x + 23 * size, y]
    const middle = x + 12 * size
    const samples: Record<string, () => Shape[]> = {
      abstraction: () => wellSymbol(middle, y, 'abstraction', size * 0.85, palette),
      recharge: () => wellSymbol(middle, y, 'recharge', size * 0.85, palette),
      piezometer: () => levelSymbol(middle, y + 4 * size, size * 0.9, palette),
      'named point': () => pointSymbol(middle, y, size, palette),
      wall: () => wallSymbol([from, to], size * 0.85, palette),
      ring: () => [
        drawn(pathOf([from, to]), palette.alarm, 1.5 * size, { lineDash: [7, 3, 2, 3], lineCap: 'butt' }),
      ],
      'no flow': () => [
        drawn(pathOf([from, to]), palette.ink, 1.2, { lineCap: 'butt' }),
        noFlowSymbol(from, to, Math.PI / 2, size, palette),
      ],
      outside: () => [
        drawn(pathOfRectangle(x + 1, y - 6 * size, 22 * size, 12 * size), palette.ink, 1.1, {
          lineJoin: 'miter',
        }),
      ],
      zone: () => {
        const ring: Vertex[] = [
          [x + 1, y - 6 * size],
          [x + 23 * size, y - 6 * size],
          [x + 23 * size, y + 6 * size],
          [x + 1, y + 6 * size],
        ]
        const hatch = hatchOf(ring, 5 * size)
          .map((line) => pathOf(line))
          .join('')
        return [
          drawn(hatch, palette.quiet, 0.9, { lineCap: 'butt' }),
          drawn(pathOf(ring, true), palette.quiet, 1.1, { lineDash: [5, 3], lineCap: 'butt' }),
        ]
      },
    }
    const sample =
      samples[item.name]?.() ??
      boundarySymbol([from, to], item.name as BoundaryLook, size * 0.85, palette, [middle, y - 10])
    return [...sample, type(x + sampleWidth, y, item.label, { fill: palette.ink, size: 12 * size })]
  })
}

function captionOf({ layout, palette }: Drawing): Shape[] {
  return layout.caption.map(({ text, x, y }) =>
    type(x, y, text, { fill: palette.ink, size: 12.5 * layout.size }),
  )
}

function watermarkOf({ layout, palette }: Drawing): Shape[] {
  const { plot } = layout
  const text = 'NOT CONVERGED'
  const angle = -Math.atan2(plot.height, plot.width) * 0.7
  const fits = Math.min(plot.width * 0.8, plot.height / Math.max(0.2, Math.abs(Math.sin(angle))))
  const size = Math.min(90, (fits / typeWidth(text, 1, true)) * 0.8)
  return [
    type(plot.left + plot.width / 2, plot.top + plot.height / 2, text, {
      fill: palette.alarm,
      size,
      weight: 600,
      align: 'center',
      angle,
      opacity: 0.55,
    }),
  ]
}

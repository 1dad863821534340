import { contours } from 'd3-contour'
import type { Vertex } from '~/book/field'
import { centresBetween, type HeadField } from './field'

/** More contours than this are a smudge, not a figure. */
export const mostContours = 60

/** The nice number (1, 2, 2.5 or 5 times a power of ten) that is nearest above `size`. */
export function niceAbove(size: number): number {
  const power = 10 ** Math.floor(Math.log10(size))
  const nice = [1, 2, 2.5, 5, 10].find((step) => step * power >= size * (1 - 1e-9)) ?? 10
  return Number((nice * power).toPrecision(12))
}

/** A nice contour interval that gives at most `most` contours between two values, and at least about half as many. */
export function automaticInterval(low: number, high: number, most = 16): number {
  const spread = high - low
  // Heads equal to within rounding have no contours: any interval that is far above the rounding will do.
  if (!(spread > 1e-9 * Math.max(1, Math.abs(low), Math.abs(high)))) return 1
  return niceAbove(spread / most)
}

/** The interval as asked for, or the automatic one when none was asked for or it would give too many contours. */
export function intervalFor(low: number, high: number, asked: number | undefined): number {
  const usable = asked !== undefined && asked > 0 && (high - low) / asked <= mostContours
  return usable ? asked : automaticInterval(low, high)
}

/** Multiples of the interval strictly between two values. */
export function levelsBetween(low: number, high: number, interval: number): number[] {
  const first = Math.floor(low / interval + 1e-9) + 1
  const last = Math.ceil(high / interval - 1e-9) - 1
  const decimals = decimalsOf(interval)
  return Array.from({ length: Math.max(0, last - first + 1) }, (_, i) =>
    Number(((first + i) * interval).toFixed(decimals)),
  )
}

/** Decimals needed to print multiples of an interval. */
export function decimalsOf(interval: number): number {
  for (let decimals = 0; decimals < 12; decimals++) {
    if (Math.abs(interval - Number(interval.toFixed(decimals))) < interval * 1e-6) return decimals
  }
  return 12
}

export interface Contour {
  level: number
  /** Where values are at or above the level: polygons of rings (the outer one first), closed along the model's edge. */
  area: Vertex[][][]
  /** The contour itself, without the parts of the rings that follow the model's edge. */
  lines: Vertex[][]
}

interface Lattice {
  x: Float64Array
  y: Float64Array
  values: Float64Array
}

/**
 * Contours of a cell-centred field on an even or uneven grid, in the field's own coordinates.
 * Values are carried on by half a cell to the model's edge, so that contours reach it, and into cells without a head,
 * which the drawing covers (`outsideCells`). Between centres the field is bilinear. Coarse grids are refined and very
 * fine ones thinned before tracing; tracing is d3-contour's marching squares with linear interpolation.
 */
export function contoursOf(field: HeadField, levels: readonly number[]): Contour[] {
  const lattice = sized(latticeOf(field))
  const columns = lattice.x.length
  const rows = lattice.y.length
  const trace = contours().size([columns, rows]).smooth(true)
  const values = lattice.values as unknown as number[]
  return levels.map((level) => {
    const area: Vertex[][][] = []
    const lines: Vertex[][] = []
    for (const polygon of trace.contour(values, level).coordinates) {
      area.push(
        polygon.map((ring) =>
          (ring as Vertex[]).map(([column, row]): Vertex => [at(lattice.x, column), at(lattice.y, row)]),
        ),
      )
      for (const ring of polygon) lines.push(...linesOf(ring as Vertex[], lattice))
    }
    return { level, area, lines }
  })
}

/** d3-contour puts sample i at i + 0.5; a ring that closes beyond the outermost sample closes on the model's edge. */
function at(samples: Float64Array, place: number): number {
  const last = samples.length - 1
  const index = Math.min(last, Math.max(0, place - 0.5))
  const low = Math.min(last - 1, Math.floor(index))
  const from = samples[low] as number
  return from + ((samples[low + 1] as number) - from) * (index - low)
}

/** Runs of a ring that do not follow the model's edge. */
function linesOf(ring: readonly Vertex[], { x, y }: Lattice): Vertex[][] {
  const open = ring.slice(0, -1)
  const closes = ([column, row]: Vertex) =>
    column === 0 || row === 0 || column === x.length || row === y.length
  const start = open.findIndex(closes)
  const place = ([column, row]: Vertex): Vertex => [at(x, column), at(y, row)]
  if (start < 0) return [ring.map(place)]
  const lines: Vertex[][] = []
  let line: Vertex[] = []
  for (let k = 0; k <= open.length; k++) {
    const vertex = open[(start + k) % open.length] as Vertex
    if (closes(vertex)) {
      if (line.length > 1) lines.push(line)
      line = []
    } else line.push(place(vertex))
  }
  return lines
}

/** Samples at the centres and on the four edges of the extent. */
function latticeOf(field: HeadField): Lattice {
  const { xEdges, yEdges } = field
  const columns = xEdges.length - 1
  const rows = yEdges.length - 1
  const filled = carriedOn(field.heads, columns, rows)
  const x = Float64Array.of(xEdges[0] as number, ...centresBetween(xEdges), xEdges[columns] as number)
  const y = Float64Array.of(yEdges[0] as number, ...centresBetween(yEdges), yEdges[rows] as number)
  const wide = columns + 2
  const values = new Float64Array(wide * (rows + 2))
  for (let j = 0; j < rows; j++) {
    const row = (j + 1) * wide
    for (let i = 0; i < columns; i++) values[row + i + 1] = filled[j * columns + i] as number
    values[row] = beyond(x, values, 0, 1, 2, row, 1, columns)
    values[row + columns + 1] = beyond(x, values, columns + 1, columns, columns - 1, row, 1, columns)
  }
  for (let i = 0; i < wide; i++) {
    values[i] = beyond(y, values, 0, 1, 2, i, wide, rows)
    values[(rows + 1) * wide + i] = beyond(y, values, rows + 1, rows, rows - 1, i, wide, rows)
  }
  return { x, y, values }
}

/** The line through two samples carried on to a third place; with one cell across, its own value. */
function beyond(
  places: Float64Array,
  values: Float64Array,
  to: number,
  near: number,
  far: number,
  offset: number,
  stride: number,
  cells: number,
): number {
  const first = values[offset + near * stride] as number
  if (cells < 2) return first
  const second = values[offset + far * stride] as number
  const run = (places[near] as number) - (places[far] as number)
  return first + ((first - second) * ((places[to] as number) - (places[near] as number))) / run
}

/** Fills cells without a head from their neighbours, ring by ring outwards, so that contours run on to the edge. */
function carriedOn(heads: Float64Array, columns: number, rows: number): Float64Array {
  const values = heads.slice()
  const neighbours = (cell: number) => {
    const i = cell % columns
    return [
      i > 0 ? cell - 1 : -1,
      i < columns - 1 ? cell + 1 : -1,
      cell - columns,
      cell + columns < columns * rows ? cell + columns : -1,
    ].filter((other) => other >= 0)
  }
  const isEmpty = (cell: number) => Number.isNaN(values[cell] as number)
  let edge: number[] = []
  for (let cell = 0; cell < values.length; cell++) {
    if (isEmpty(cell) && neighbours(cell).some((other) => !isEmpty(other))) edge.push(cell)
  }
  while (edge.length > 0) {
    const means = edge.map((cell) => {
      const known = neighbours(cell).filter((other) => !isEmpty(other))
      return known.reduce((sum, other) => sum + (values[other] as number), 0) / known.length
    })
    for (const [k, cell] of edge.entries()) values[cell] = means[k] as number
    edge = [...new Set(edge.flatMap((cell) => neighbours(cell).filter(isEmpty)))]
  }
  return values
}

const fewestSamples = 160
const mostSamples = 560

/** Refines a coarse lattice, thins a very fine one; the outermost samples stay. */
function sized(lattice: Lattice): Lattice {
  const column = samplesAlong(lattice.x)
  const row = samplesAlong(lattice.y)
  const values = new Float64Array(column.places.length * row.places.length)
  const wide = lattice.x.length
  for (let j = 0; j < row.places.length; j++) {
    const low = row.low[j] as number
    const up = row.weight[j] as number
    for (let i = 0; i < column.places.length; i++) {
      const left = column.low[i] as number
      const across = column.weight[i] as number
      const below = low * wide + left
      const above = below + wide
      values[j * column.places.length + i] =
        ((lattice.values[below] as number) * (1 - across) + (lattice.values[below + 1] as number) * across) *
          (1 - up) +
        ((lattice.values[above] as number) * (1 - across) + (lattice.values[above + 1] as number) * across) *
          up
    }
  }
  return { x: column.places, y: row.places, values }
}

function samplesAlong(places: Float64Array): { places: Float64Array; low: Int32Array; weight: Float64Array } {
  const intervals = places.length - 1
  const parts = Math.min(8, Math.max(1, Math.floor(fewestSamples / intervals)))
  const skip = Math.max(1, Math.ceil(intervals / mostSamples))
  const count = parts > 1 ? intervals * parts : Math.ceil(intervals / skip)
  const out = new Float64Array(count + 1)
  const low = new Int32Array(count + 1)
  const weight = new Float64Array(count + 1)
  for (let k = 0; k <= count; k++) {
    const index = Math.min(intervals, parts > 1 ? k / parts : k * skip)
    const from = Math.min(intervals - 1, Math.floor(index))
    low[k] = from
    weight[k] = index - from
    out[k] =
      (places[from] as number) +
      ((places[from + 1] as number) - (places[from] as number)) * (weight[k] as number)
  }
  return { places: out, low, weight }
}

interface CellBlock {
  x: [number, number]
  y: [number, number]
}

/** Cells without a head, as rectangles: what the drawing covers. Runs along a row that repeat in the next are one. */
export function outsideCells(field: HeadField): CellBlock[] {
  const { xEdges, yEdges, heads } = field
  const columns = xEdges.length - 1
  const blocks: CellBlock[] = []
  let before = new Map<string, CellBlock>()
  for (let j = 0; j < yEdges.length - 1; j++) {
    const here = new Map<string, CellBlock>()
    const bottom = yEdges[j] as number
    const top = yEdges[j + 1] as number
    let from = -1
    for (let i = 0; i <= columns; i++) {
      const empty = i < columns && Number.isNaN(heads[j * columns + i] as number)
      if (empty && from < 0) from = i
      if (empty || from < 0) continue
      const key = `${from}-${i}`
      const block = before.get(key) ?? {
        x: [xEdges[from] as number, xEdges[i] as number],
        y: [bottom, top],
      }
      if (block.y[1] === top) blocks.push(block)
      block.y[1] = top
      here.set(key, block)
      from = -1
    }
    before = here
  }
  return blocks
}

/** The outline between cells with and without a head, as straight pieces along cell edges. */
export function outlineOfOutside(field: HeadField): [Vertex, Vertex][] {
  const { xEdges, yEdges, heads } = field
  const columns = xEdges.length - 1
  const rows = yEdges.length - 1
  const empty = (i: number, j: number) => Number.isNaN(heads[j * columns + i] as number)
  const pieces: [Vertex, Vertex][] = []
  for (let j = 0; j < rows; j++) {
    for (let i = 0; i < columns; i++) {
      const right = xEdges[i + 1] as number
      const top = yEdges[j + 1] as number
      if (i + 1 < columns && empty(i, j) !== empty(i + 1, j)) {
        pieces.push([
          [right, yEdges[j] as number],
          [right, top],
        ])
      }
      if (j + 1 < rows && empty(i, j) !== empty(i, j + 1)) {
        pieces.push([
          [xEdges[i] as number, top],
          [right, top],
        ])
      }
    }
  }
  return pieces
}

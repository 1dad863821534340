import type { GivenGrid, Model, UniformGrid } from './model'
import { ModelError, requireFinite } from './model-error'

/**
 * A rectangular grid. Cell (i, j) lies in column i from the lowest x and row j from the lowest y and has index
 * `j * columns + i`. Edges have `columns + 1` and `rows + 1` entries, rising. Units: the model's length.
 */
export interface Grid {
  columns: number
  rows: number
  xEdges: Float64Array
  yEdges: Float64Array
}

/** Beyond this many cells a model is refused before any memory is taken. */
export const largestCellCount = 4_200_000

/** The centres between `edges`: one fewer than there are edges. */
export function centresOf(edges: Float64Array): Float64Array {
  const centres = new Float64Array(edges.length - 1)
  for (let i = 0; i < centres.length; i++) {
    centres[i] = ((edges[i] as number) + (edges[i + 1] as number)) / 2
  }
  return centres
}

/** Index of the interval of rising `edges` that holds `value` (the upper one on an edge), -1 before, length - 1 after. */
export function intervalOf(edges: Float64Array, value: number): number {
  let low = -1
  let high = edges.length
  while (high - low > 1) {
    const middle = (low + high) >> 1
    if ((edges[middle] as number) <= value) low = middle
    else high = middle
  }
  return low
}

/** The cell that holds (x, y), a point on the outer edge included, or -1 outside the extent. */
export function cellAt(grid: Grid, x: number, y: number): number {
  const i = columnAt(grid.xEdges, x)
  const j = columnAt(grid.yEdges, y)
  return i < 0 || j < 0 ? -1 : j * grid.columns + i
}

function columnAt(edges: Float64Array, value: number): number {
  const last = edges.length - 1
  if (value === edges[last]) return last - 1
  const i = intervalOf(edges, value)
  return i >= 0 && i < last ? i : -1
}

/** The uniform or given grid of a model file. Refuses empty, unordered or over-large grids. */
export function gridOf(model: Model, given: UniformGrid | GivenGrid): Grid {
  const [west, east] = extentOf(model.extent.x, 'extent.x')
  const [south, north] = extentOf(model.extent.y, 'extent.y')
  if ('xEdges' in given) {
    const xEdges = givenEdges(given.xEdges, west, east, 'grid.xEdges')
    const yEdges = givenEdges(given.yEdges, south, north, 'grid.yEdges')
    return sized({ columns: xEdges.length - 1, rows: yEdges.length - 1, xEdges, yEdges })
  }
  const columns = wholeCount(given.columns, 'grid.columns')
  const rows = wholeCount(given.rows, 'grid.rows')
  if (columns * rows > largestCellCount) {
    throw new ModelError('grid', `${columns} x ${rows} cells are more than the ${largestCellCount} allowed`)
  }
  return { columns, rows, xEdges: evenEdges(west, east, columns), yEdges: evenEdges(south, north, rows) }
}

function extentOf(range: [number, number], path: string): [number, number] {
  const low = requireFinite(range[0], `${path}[0]`)
  const high = requireFinite(range[1], `${path}[1]`)
  if (high <= low) throw new ModelError(path, `runs from ${low} to ${high}; the second must be the greater`)
  return [low, high]
}

function wholeCount(value: number, path: string): number {
  if (!Number.isInteger(value) || value < 1) throw new ModelError(path, 'must be a whole number of 1 or more')
  return value
}

function evenEdges(low: number, high: number, count: number): Float64Array {
  const edges = new Float64Array(count + 1)
  for (let i = 0; i <= count; i++) edges[i] = low + ((high - low) * i) / count
  edges[count] = high
  return edges
}

function givenEdges(values: number[], low: number, high: number, path: string): Float64Array {
  if (values.length < 2) throw new ModelError(path, 'needs at least two edges')
  for (let i = 0; i < values.length; i++) {
    const value = requireFinite(values[i], `${path}[${i}]`)
    if (i > 0 && value <= (values[i - 1] as number)) {
      throw new ModelError(`${path}[${i}]`, 'edges must rise from one to the next')
    }
  }
  const tolerance = 1e-9 * (high - low)
  if (Math.abs((values[0] as number) - low) > tolerance) {
    throw new ModelError(`${path}[0]`, `must lie on the extent's edge ${low}`)
  }
  if (Math.abs((values[values.length - 1] as number) - high) > tolerance) {
    throw new ModelError(`${path}[${values.length - 1}]`, `must lie on the extent's edge ${high}`)
  }
  return Float64Array.from(values)
}

function sized(grid: Grid): Grid {
  if (grid.columns * grid.rows > largestCellCount) {
    throw new ModelError(
      'grid',
      `${grid.columns * grid.rows} cells are more than the ${largestCellCount} allowed`,
    )
  }
  return grid
}

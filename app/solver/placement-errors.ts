import type { Discretised } from './discretise'
import { faceBetweenColumns, faceBetweenRows } from './faces'
import { cellAt, centresOf, intervalOf } from './grid'
import type { DischargeLine, Position } from './model'

/**
 * Estimate of what interpolating linearly between centres leaves out at each point of the model: half the product of
 * the distances to the centres on both sides, times the second difference of the heads there, along x and along y. A
 * row of grids that share faces cannot tell where all of them interpolate along the same tangent.
 */
export function interpolationErrors(d: Discretised, heads: Float64Array): number[] {
  return (d.model.points ?? []).map(({ x, y }) => {
    const cell = cellAt(d.grid, x, y)
    if (cell < 0 || d.active[cell] !== 1) return 0
    return alongAxis(d, heads, cell, 'x', x) + alongAxis(d, heads, cell, 'y', y)
  })
}

function alongAxis(d: Discretised, heads: Float64Array, cell: number, axis: 'x' | 'y', at: number): number {
  const { grid } = d
  const j = Math.floor(cell / grid.columns)
  const own = axis === 'x' ? cell - j * grid.columns : j
  const centres = centresOf(axis === 'x' ? grid.xEdges : grid.yEdges)
  const stride = axis === 'x' ? 1 : grid.columns
  const low = intervalOf(centres, at)
  const isLast = low < 0 || low === centres.length - 1
  // Beyond the outermost centre the head runs on to the face; the half cell there bends as its neighbours do.
  const distances = isLast
    ? (at - (centres[own] as number)) ** 2
    : (at - (centres[low] as number)) * ((centres[low + 1] as number) - at)
  let bend = 0
  for (const k of [own - 1, own, own + 1]) {
    bend = Math.max(bend, Math.abs(secondDifference(d, heads, cell + (k - own) * stride, k, axis, centres)))
  }
  return 0.5 * Math.abs(distances) * bend
}

/** 0 where a neighbour is missing or behind a wall. */
function secondDifference(
  d: Discretised,
  heads: Float64Array,
  cell: number,
  k: number,
  axis: 'x' | 'y',
  centres: Float64Array,
): number {
  if (k < 1 || k > centres.length - 2) return 0
  const { grid } = d
  const stride = axis === 'x' ? 1 : grid.columns
  const j = Math.floor(cell / grid.columns)
  const i = cell - j * grid.columns
  const faces =
    axis === 'x'
      ? [faceBetweenColumns(grid, i, j), faceBetweenColumns(grid, i + 1, j)]
      : [faceBetweenRows(grid, i, j), faceBetweenRows(grid, i, j + 1)]
  if (faces.some((face) => (d.wallShare[face] as number) > 0)) return 0
  if (d.active[cell - stride] !== 1 || d.active[cell] !== 1 || d.active[cell + stride] !== 1) return 0
  const [a, b, c] = [centres[k - 1], centres[k], centres[k + 1]] as [number, number, number]
  const rise = ((heads[cell + stride] as number) - (heads[cell] as number)) / (c - b)
  const fall = ((heads[cell] as number) - (heads[cell - stride] as number)) / (b - a)
  return (2 * (rise - fall)) / (c - a)
}

const left = ' (half a cell to the left)'
const right = ' (half a cell to the right)'

/**
 * The model's discharge lines and two copies of each, half a cell of its grid to both sides: a line is followed along
 * faces up to half a cell away, and what enters or is taken between counts in its discharge or not.
 */
export function withShiftedLines(d: Discretised): DischargeLine[] {
  return (d.model.lines ?? []).flatMap((line) => [
    line,
    { name: line.name + left, line: shifted(d, line.line, 0.5) },
    { name: line.name + right, line: shifted(d, line.line, -0.5) },
  ])
}

/** Names of the copies of a line. */
export function shiftedNames(name: string): [string, string] {
  return [name + left, name + right]
}

function shifted(d: Discretised, line: Position[], cells: number): Position[] {
  const { x, y } = d.model.extent
  return line.map((vertex, k): Position => {
    const before = line[Math.max(0, k - 1)] as Position
    const after = line[Math.min(line.length - 1, k + 1)] as Position
    const length = Math.hypot(after[0] - before[0], after[1] - before[1]) || 1
    const [nx, ny] = [-(after[1] - before[1]) / length, (after[0] - before[0]) / length]
    const [width, height] = cellSizeAt(d, vertex)
    return [clamped(vertex[0] + cells * nx * width, x), clamped(vertex[1] + cells * ny * height, y)]
  })
}

function clamped(value: number, [low, high]: [number, number]): number {
  return Math.min(high, Math.max(low, value))
}

function cellSizeAt({ grid }: Discretised, [x, y]: Position): [number, number] {
  const size = (edges: Float64Array, value: number) => {
    const k = Math.min(edges.length - 2, Math.max(0, intervalOf(edges, value)))
    return (edges[k + 1] as number) - (edges[k] as number)
  }
  return [size(grid.xEdges, x), size(grid.yEdges, y)]
}

import { centresOf, type Grid, intervalOf } from './grid'
import type { Model, Position } from './model'

/** A cell's part in a place that lies between cell centres; the weights of a place add up to 1. */
export interface Share {
  cell: number
  weight: number
}

/**
 * The four cell centres around a place. Corner k has column `k & 1` and row `k >> 1` of the pair; its cell is -1
 * outside the extent. `fx`, `fy`: how far the place lies from the first centre to the second, 0..1; beyond the
 * outermost centre the missing one is thought as far outside the edge as the last one is inside.
 */
export interface Stencil {
  cells: [number, number, number, number]
  fx: number
  fy: number
  /** Is there ground at the corner's centre, and no wall between it and the place? */
  visible: [boolean, boolean, boolean, boolean]
}

/**
 * The four cell centres around a place and where it lies between them, for bilinear interpolation. Beyond the outer
 * centres the grid is mirrored at its edge; a cell that is not there is -1 and not visible.
 */
export function stencilAt(model: Model, grid: Grid, active: Uint8Array, x: number, y: number): Stencil {
  const xCentres = centresOf(grid.xEdges)
  const yCentres = centresOf(grid.yEdges)
  const i = intervalOf(xCentres, x)
  const j = intervalOf(yCentres, y)
  const [x0, x1] = pairAround(grid.xEdges, xCentres, i)
  const [y0, y1] = pairAround(grid.yEdges, yCentres, j)
  const cells = [0, 1, 2, 3].map((k) => {
    const column = i + (k & 1)
    const row = j + (k >> 1)
    return column >= 0 && column < grid.columns && row >= 0 && row < grid.rows
      ? row * grid.columns + column
      : -1
  }) as Stencil['cells']
  const visible = cells.map((cell, k) => {
    if (cell < 0 || active[cell] !== 1) return false
    return !wallBetween(model, grid, [x, y], [k & 1 ? x1 : x0, k >> 1 ? y1 : y0])
  }) as Stencil['visible']
  return { cells, fx: (x - x0) / (x1 - x0), fy: (y - y0) / (y1 - y0), visible }
}

function pairAround(edges: Float64Array, centres: Float64Array, index: number): [number, number] {
  const last = centres.length - 1
  const first = index >= 0 ? (centres[index] as number) : 2 * (edges[0] as number) - (centres[0] as number)
  const second =
    index < last
      ? (centres[index + 1] as number)
      : 2 * (edges[last + 1] as number) - (centres[last] as number)
  return [first, second]
}

/** Bilinear weight of a corner (0 low x and y, 1 high x, 2 high y, 3 both); the four add up to 1. */
export function weightOf(stencil: Stencil, corner: number): number {
  const wx = corner & 1 ? stencil.fx : 1 - stencil.fx
  const wy = corner >> 1 ? stencil.fy : 1 - stencil.fy
  return wx * wy
}

/** Does a wall run between the two places? Walls are shifted by the same hair as in `crossedFaces`. */
function wallBetween(model: Model, grid: Grid, from: Position, to: Position): boolean {
  const shiftX = 1e-6 * smallest(grid.xEdges)
  const shiftY = 0.7e-6 * smallest(grid.yEdges)
  for (const wall of model.walls ?? []) {
    for (let s = 0; s + 1 < wall.line.length; s++) {
      const [p, q] = [wall.line[s] as Position, wall.line[s + 1] as Position]
      const a: Position = [p[0] + shiftX, p[1] + shiftY]
      const b: Position = [q[0] + shiftX, q[1] + shiftY]
      if (side(a, b, from) * side(a, b, to) <= 0 && side(from, to, a) * side(from, to, b) <= 0) {
        if (side(a, b, from) !== 0 || side(a, b, to) !== 0) return true
      }
    }
  }
  return false
}

function side(a: Position, b: Position, c: Position): number {
  return (b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0])
}

function smallest(edges: Float64Array): number {
  let step = Number.POSITIVE_INFINITY
  for (let k = 0; k + 1 < edges.length; k++)
    step = Math.min(step, (edges[k + 1] as number) - (edges[k] as number))
  return step
}

/**
 * The wall segment a place lies on, with its direction as a unit vector, or null. A place within a millionth of a cell
 * lies on it.
 */
export function wallAt(model: Model, grid: Grid, x: number, y: number): [number, number] | null {
  const near = 2e-6 * Math.min(smallest(grid.xEdges), smallest(grid.yEdges))
  for (const wall of model.walls ?? []) {
    for (let s = 0; s + 1 < wall.line.length; s++) {
      const [a, b] = [wall.line[s] as Position, wall.line[s + 1] as Position]
      const length = Math.hypot(b[0] - a[0], b[1] - a[1])
      if (length === 0) continue
      const along = ((x - a[0]) * (b[0] - a[0]) + (y - a[1]) * (b[1] - a[1])) / length
      if (along < -near || along > length + near) continue
      if (Math.abs(side(a, b, [x, y])) / length <= near)
        return [(b[0] - a[0]) / length, (b[1] - a[1]) / length]
    }
  }
  return null
}

/**
 * How a well at (x, y) is shared among the surrounding centres: bilinear, but never across a wall or into a hole.
 * Beyond the outermost centres the rest of the weight goes to those that remain.
 */
export function sharesAt(
  model: Model,
  grid: Grid,
  active: Uint8Array,
  x: number,
  y: number,
): { shares: Share[] } | 'on a wall' | 'hidden' | 'outside' {
  if (wallAt(model, grid, x, y)) return 'on a wall'
  const stencil = stencilAt(model, grid, active, x, y)
  const corners = [0, 1, 2, 3].filter((k) => stencil.visible[k as 0])
  if (corners.length === 0) return stencil.cells.some((cell) => active[cell] === 1) ? 'hidden' : 'outside'
  const weights = corners.map((k) => weightOf(stencil, k))
  const total = weights.reduce((sum, weight) => sum + weight, 0)
  if (total <= 1e-6) {
    // Only far corners can be seen from here: the nearest of them takes it all.
    const nearest = corners[weights.indexOf(Math.max(...weights))] as 0
    return { shares: [{ cell: stencil.cells[nearest], weight: 1 }] }
  }
  const kept = corners
    .map((k, index) => ({ cell: stencil.cells[k as 0], weight: (weights[index] as number) / total }))
    .filter((share) => share.weight > 1e-9)
  const sum = kept.reduce((partial, share) => partial + share.weight, 0)
  return { shares: kept.map((share) => ({ cell: share.cell, weight: share.weight / sum })) }
}

import type { Discretised } from './discretise'
import { faceBetweenColumns, faceBetweenRows, faceOf } from './faces'
import type { FlowModel, ProfileFlow } from './flow'
import { cellAt } from './grid'
import { type Profile, transmissivityAt } from './ground'
import type { Point } from './model'
import { ModelError, requireFinite } from './model-error'
import { stencilAt, wallAt, weightOf } from './placing'
import type { PointResult } from './result'
import { levelOfPotential, potentialAt } from './saturated'

/** Refuses points outside the extent and points on a wall that do not say on which side of it they stand. */
export function checkPoints(d: Discretised): void {
  for (const [index, point] of (d.model.points ?? []).entries()) placeOfPoint(d, point, `points[${index}]`)
}

/** Where a point's head is read: beside a wall, a hair to the side it says. */
export function placeOfPoint(d: Discretised, point: Point, path: string): [x: number, y: number] {
  const x = requireFinite(point.x, `${path}.x`)
  const y = requireFinite(point.y, `${path}.y`)
  if (cellAt(d.grid, x, y) < 0) {
    throw new ModelError(`${path}.x`, `the point "${point.name}" at (${x}, ${y}) lies outside the extent`)
  }
  const direction = wallAt(d.model, d.grid, x, y)
  if (!direction) return [x, y]
  if (!point.side) {
    throw new ModelError(
      path,
      `the point "${point.name}" lies on a wall: say "side": "left" or "right" of its line`,
    )
  }
  const cell = Math.min(
    (d.grid.xEdges[d.grid.columns] as number) - (d.grid.xEdges[0] as number),
    (d.grid.yEdges[d.grid.rows] as number) - (d.grid.yEdges[0] as number),
  )
  const step = ((point.side === 'left' ? 1 : -1) * 1e-4 * cell) / Math.max(d.grid.columns, d.grid.rows)
  return [x - step * direction[1], y + step * direction[0]]
}

/**
 * Heads at the points, above the reference. `inflow`: flow into the ground through each outer face, by face.
 */
export function pointResults(
  flow: FlowModel,
  heads: Float64Array,
  inflow: Map<number, number>,
  reference: number,
): PointResult[] {
  const { d } = flow
  return (d.model.points ?? []).map((point, index) => {
    const [x, y] = placeOfPoint(d, point, `points[${index}]`)
    const head = headAt(flow, heads, inflow, x, y)
    if (head === 'no ground') return { name: point.name, head: [null], why: 'there is no ground here' }
    if (head === 'hidden') {
      return { name: point.name, head: [null], why: 'there is no cell centre on this side of the walls' }
    }
    if (head === 'dry') return { name: point.name, head: [null], why: 'dry' }
    return { name: point.name, head: [head + reference] }
  })
}

/**
 * Head at (x, y): bilinear between the surrounding centres. A centre that a wall hides, or where there is no ground,
 * is replaced by what continues the near cell to its face: the head at a boundary's face, or the mirror of no flow.
 */
export function headAt(
  flow: FlowModel,
  heads: Float64Array,
  inflow: Map<number, number>,
  x: number,
  y: number,
): number | 'no ground' | 'hidden' | 'dry' {
  const { d } = flow
  const stencil = stencilAt(d.model, d.grid, d.active, x, y)
  const seen = ([0, 1, 2, 3] as const).filter((k) => stencil.visible[k])
  if (seen.length === 0) return stencil.cells.some((cell) => d.active[cell] === 1) ? 'hidden' : 'no ground'
  let near = seen[0] as 0 | 1 | 2 | 3
  for (const k of seen) if (weightOf(stencil, k) > weightOf(stencil, near)) near = k
  const cell = stencil.cells[near]
  if (d.unconfined) {
    const { base } = flow.flows[d.profileOf[cell] as number] as ProfileFlow
    if ((heads[cell] as number) <= base + 2 * flow.film) return 'dry'
  }
  const [besideX, besideY, across] = [near ^ 1, near ^ 2, near ^ 3] as [0, 0, 0]
  const own = heads[cell] as number
  const eastward = (near & 1) === 0
  const northward = near >> 1 === 0
  const alongX = stencil.visible[besideX]
    ? (heads[stencil.cells[besideX]] as number)
    : continued(flow, heads, inflow, cell, 'x', eastward)
  const alongY = stencil.visible[besideY]
    ? (heads[stencil.cells[besideY]] as number)
    : continued(flow, heads, inflow, cell, 'y', northward)
  let corner: number
  if (stencil.visible[across]) corner = heads[stencil.cells[across]] as number
  else if (stencil.visible[besideX] && !stencil.visible[besideY]) {
    corner = continued(flow, heads, inflow, stencil.cells[besideX], 'y', northward)
  } else if (stencil.visible[besideY] && !stencil.visible[besideX]) {
    corner = continued(flow, heads, inflow, stencil.cells[besideY], 'x', eastward)
  } else corner = alongX + alongY - own
  return (
    weightOf(stencil, near) * own +
    weightOf(stencil, besideX) * alongX +
    weightOf(stencil, besideY) * alongY +
    weightOf(stencil, across) * corner
  )
}

/** The head that carries on linearly from a cell's centre through its face to the centre beyond. */
function continued(
  flow: FlowModel,
  heads: Float64Array,
  inflow: Map<number, number>,
  cell: number,
  axis: 'x' | 'y',
  towardsHigh: boolean,
): number {
  const { d } = flow
  const { columns } = d.grid
  const row = Math.floor(cell / columns)
  const column = cell - row * columns
  const step = towardsHigh ? 1 : 0
  const face =
    axis === 'x'
      ? faceBetweenColumns(d.grid, column + step, row)
      : faceBetweenRows(d.grid, column, row + step)
  const own = heads[cell] as number
  const q = inflow.get(face) ?? 0
  if (q === 0 && !d.corners) return own
  const { length, lowHalf, highHalf } = faceOf(d.grid, face)
  const half = towardsHigh ? lowHalf : highHalf
  const beyond = (towardsHigh ? highHalf : lowHalf) || half
  let rise = (q * half) / length
  // Askew to the grid a gradient along the face drives flow through it, and the rest is what the head beyond drives.
  if (d.corners) rise += (towardsHigh ? -1 : 1) * half * drivenAcross(flow, heads, cell, axis)
  const faceHead = headBehind(flow, cell, axis, own, rise)
  return own + ((faceHead - own) * (half + beyond)) / half
}

/** Cross term of the transmissivity times the gradient along a face of the given axis, from the cells beside this one. */
function drivenAcross(flow: FlowModel, heads: Float64Array, cell: number, axis: 'x' | 'y'): number {
  const { d } = flow
  const { columns, rows } = d.grid
  const profile = d.profiles[d.profileOf[cell] as number] as Profile
  const j = Math.floor(cell / columns)
  const at = axis === 'x' ? j : cell - j * columns
  const edges = axis === 'x' ? d.grid.yEdges : d.grid.xEdges
  const step = axis === 'x' ? columns : 1
  const centre = (k: number) => ((edges[k] as number) + (edges[k + 1] as number)) / 2
  const low = at > 0 && d.active[cell - step] === 1 ? -1 : 0
  const high = at < (axis === 'x' ? rows : columns) - 1 && d.active[cell + step] === 1 ? 1 : 0
  if (low === high) return 0
  const gradient =
    ((heads[cell + high * step] as number) - (heads[cell + low * step] as number)) /
    (centre(at + high) - centre(at + low))
  const own = heads[cell] as number
  return transmissivityAt(profile, profile.kxy, d.unconfined ? own : Number.POSITIVE_INFINITY) * gradient
}

function headBehind(flow: FlowModel, cell: number, axis: 'x' | 'y', own: number, rise: number): number {
  const profile = flow.d.profileOf[cell] as number
  if (!flow.d.unconfined) return own + rise / ((axis === 'x' ? flow.fullX : flow.fullY)[profile] as number)
  const potential = (flow.flows[profile] as ProfileFlow)[axis]
  return levelOfPotential(potential, potentialAt(potential, own) + rise)
}

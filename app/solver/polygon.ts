import type { Grid } from './grid'
import { centresOf, intervalOf } from './grid'
import type { Position } from './model'
import { ModelError, requireFinite } from './model-error'

/**
 * The polygon without a repeated closing vertex. Refuses fewer than three corners, numbers that are not finite and
 * sides that cross: an overlapped area would have no clear meaning then.
 */
export function checkedPolygon(polygon: Position[], path: string): Position[] {
  polygon.forEach((corner, index) => {
    requireFinite(corner[0], `${path}[${index}][0]`)
    requireFinite(corner[1], `${path}[${index}][1]`)
  })
  const first = polygon[0]
  const last = polygon[polygon.length - 1]
  const closed = first && last && polygon.length > 1 && first[0] === last[0] && first[1] === last[1]
  const corners = closed ? polygon.slice(0, -1) : polygon
  if (corners.length < 3) throw new ModelError(path, 'a polygon needs at least three corners')
  for (let i = 0; i < corners.length; i++) {
    for (let j = i + 2; j < corners.length; j++) {
      if (i === 0 && j === corners.length - 1) continue
      const a = corners[i] as Position
      const b = corners[i + 1] as Position
      const c = corners[j] as Position
      const d = corners[(j + 1) % corners.length] as Position
      if (segmentsCross(a, b, c, d)) {
        throw new ModelError(path, `the polygon's sides ${i + 1} and ${j + 1} cross`)
      }
    }
  }
  return corners
}

/** Do the open segments ab and cd cross in one point that is an end of neither? */
export function segmentsCross(a: Position, b: Position, c: Position, d: Position): boolean {
  const abc = turn(a, b, c)
  const abd = turn(a, b, d)
  const cda = turn(c, d, a)
  const cdb = turn(c, d, b)
  return abc * abd < 0 && cda * cdb < 0
}

function turn(a: Position, b: Position, c: Position): number {
  return (b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0])
}

/** Calls `visit` with the index of every cell whose centre lies inside the polygon (even-odd rule). */
export function visitCellsInside(grid: Grid, polygon: Position[], visit: (cell: number) => void): void {
  const xCentres = centresOf(grid.xEdges)
  const yCentres = centresOf(grid.yEdges)
  for (let j = 0; j < grid.rows; j++) {
    const crossings = crossingsAt(polygon, yCentres[j] as number)
    for (let k = 0; k + 1 < crossings.length; k += 2) {
      // intervalOf gives the last centre at or before a crossing: the span is (from, to].
      const from = intervalOf(xCentres, crossings[k] as number) + 1
      const to = intervalOf(xCentres, crossings[k + 1] as number)
      for (let i = from; i <= to; i++) visit(j * grid.columns + i)
    }
  }
}

/** Is (x, y) inside the polygon (even-odd rule)? */
export function isInside(polygon: Position[], x: number, y: number): boolean {
  let count = 0
  for (const crossing of crossingsAt(polygon, y)) if (crossing < x) count++
  return count % 2 === 1
}

function crossingsAt(polygon: Position[], y: number): number[] {
  const crossings: number[] = []
  for (let k = 0; k < polygon.length; k++) {
    const a = polygon[k] as Position
    const b = polygon[(k + 1) % polygon.length] as Position
    // Half-open in y, so that a corner at this height counts once; a centre on a side lies on the side of it that
    // crossedFaces sees, too.
    if (a[1] < y !== b[1] < y) crossings.push(a[0] + ((y - a[1]) / (b[1] - a[1])) * (b[0] - a[0]))
  }
  return crossings.sort((p, q) => p - q)
}

/**
 * Calls `visit` with every cell the polygon overlaps and the overlapped area (Sutherland & Hodgman 1974, Reentrant
 * polygon clipping; the area of a clipped re-entrant polygon is right although its outline may fold on itself).
 */
export function visitOverlaps(
  grid: Grid,
  polygon: Position[],
  visit: (cell: number, area: number) => void,
): void {
  for (let j = 0; j < grid.rows; j++) {
    const south = grid.yEdges[j] as number
    const north = grid.yEdges[j + 1] as number
    const strip = clipped(clipped(polygon, 1, south, 1), 1, north, -1)
    if (strip.length < 3) continue
    let west = Number.POSITIVE_INFINITY
    let east = Number.NEGATIVE_INFINITY
    for (const corner of strip) {
      west = Math.min(west, corner[0])
      east = Math.max(east, corner[0])
    }
    const from = Math.max(0, intervalOf(grid.xEdges, west))
    const to = Math.min(grid.columns - 1, intervalOf(grid.xEdges, east))
    let rest = strip
    for (let i = from; i <= to; i++) {
      const edge = grid.xEdges[i + 1] as number
      // What is left of this edge belongs to this cell; the rest moves on to the next one.
      const area = Math.abs(
        signedArea(clipped(i === from ? clipped(rest, 0, grid.xEdges[i] as number, 1) : rest, 0, edge, -1)),
      )
      rest = clipped(rest, 0, edge, 1)
      if (area > 0) visit(j * grid.columns + i, area)
    }
  }
}

/** Area of a polygon, positive when its corners run anticlockwise. */
export function signedArea(polygon: Position[]): number {
  const origin = polygon[0]
  if (!origin) return 0
  let twice = 0
  for (let k = 1; k + 1 < polygon.length; k++)
    twice += turn(origin, polygon[k] as Position, polygon[k + 1] as Position)
  return twice / 2
}

function clipped(polygon: Position[], axis: 0 | 1, limit: number, side: 1 | -1): Position[] {
  const kept: Position[] = []
  for (let k = 0; k < polygon.length; k++) {
    const a = polygon[k] as Position
    const b = polygon[(k + 1) % polygon.length] as Position
    const aIn = side * (a[axis] - limit) >= 0
    const bIn = side * (b[axis] - limit) >= 0
    if (aIn) kept.push(a)
    if (aIn !== bIn) {
      const t = (limit - a[axis]) / (b[axis] - a[axis])
      const cut: Position = [a[0] + t * (b[0] - a[0]), a[1] + t * (b[1] - a[1])]
      cut[axis] = limit
      kept.push(cut)
    }
  }
  return kept
}

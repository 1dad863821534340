import { type Grid, largestCellCount } from './grid'
import type { Ground, Model, PlannedGrid, Position } from './model'
import { ModelError, requireFinite, requirePositive } from './model-error'
import { checkedPolygon, isInside } from './polygon'
import type { Warning } from './result'

/** Neighbouring cells of a planned grid differ at most by this factor. */
export const largestGrowth = 1.3

/** Edges closer together than this share of the cells wanted there become one. */
const tooClose = 0.1

/** A line or a ground's outline that turns by less than this (degrees) at a vertex follows a curve: no corner. */
const leastTurn = 20

/** A shade below the allowed growth, so that rounding never carries a pair of cells over it. */
const growth = largestGrowth * (1 - 1e-7)

/** Place where an edge belongs; the lower its rank, the later it gives way to another one close by. */
interface Feature {
  at: number
  rank: number
  what: string
  /** Cells at this edge are at most so wide; only refine points ask for that. */
  size: number
  /** Is it one at all? Asked only where no edge lies already, as the answer takes time. */
  isThere?: () => boolean
}

const mostRefinePoints = 1000

/** Places looked up in the outlines of the ground before a grid is refused: some seconds. */
const mostLookUps = 3e8

/**
 * Plans the edges of a grid from a largest cell size and refine points. Edges lie at the extent, at refine points, at
 * the ends and bends of walls and boundary lines, at corners of ground where no ground lies beside it, and along
 * material interfaces parallel to an axis. Between them stand as few cells as these rules allow: no cell wider than
 * `cellSize`, the two columns and rows that meet at a refine point no wider than its own cell size, and neighbours
 * within a factor of 1.3 of each other everywhere. A pure function of the model. Lengths in the model's unit.
 *
 * Nothing is refined that the model does not ask for: a wall's end, a well or a line gets smaller cells by a refine
 * point put there, and by nothing else, so that a file always says itself how fine its grid is. Wells ask for no
 * edges; a refine point at a well puts it on the corner of four equal cells.
 *
 * Edges closer together than a tenth of the cell size wanted there are merged, with a warning: a refine point wins over
 * a wall, a wall over the ground's corners and boundaries, these over interfaces. Throws ModelError for sizes that are
 * not positive, refine points outside the extent, and too many cells (before memory is taken for them).
 */
export function plannedGrid(model: Model, planned: PlannedGrid, warnings: Warning[]): Grid {
  const largest = requirePositive(planned.cellSize, 'grid.cellSize')
  const axes = ([0, 1] as const).map((axis) => {
    const [low, high] = extentOf(model, axis)
    const features = featuresOf(model, planned, axis, low, high)
    return segmentsOf(mergedFeatures(features, planned, axis, largest, low, high, warnings), largest)
  }) as [Segment[], Segment[]]
  const [fewestColumns, fewestRows] = axes.map((segments) =>
    segments.reduce((sum, segment) => sum + fewestCells(segment), 0),
  ) as [number, number]
  requireCount(fewestColumns, fewestRows)
  const [columnPlan, rowPlan] = axes.map(planOf) as [Plan, Plan]
  requireCount(columnPlan.count, rowPlan.count)
  return {
    columns: columnPlan.count,
    rows: rowPlan.count,
    xEdges: edgesOf(axes[0], columnPlan),
    yEdges: edgesOf(axes[1], rowPlan),
  }
}

function requireCount(columns: number, rows: number): void {
  if (columns * rows <= largestCellCount) return
  throw new ModelError('grid', `${columns} x ${rows} cells are more than the ${largestCellCount} allowed`)
}

function extentOf(model: Model, axis: 0 | 1): [number, number] {
  const path = axis === 0 ? 'extent.x' : 'extent.y'
  const range = axis === 0 ? model.extent.x : model.extent.y
  const low = requireFinite(range[0], `${path}[0]`)
  const high = requireFinite(range[1], `${path}[1]`)
  if (high <= low) throw new ModelError(path, `runs from ${low} to ${high}; the second must be the greater`)
  return [low, high]
}

function featuresOf(model: Model, planned: PlannedGrid, axis: 0 | 1, low: number, high: number): Feature[] {
  const features: Feature[] = [low, high].map((at) => ({
    at,
    rank: 0,
    what: "the extent's edge",
    size: Number.POSITIVE_INFINITY,
  }))
  function add(
    at: number,
    rank: number,
    what: string,
    size = Number.POSITIVE_INFINITY,
    isThere?: () => boolean,
  ): void {
    if (at > low && at < high) features.push({ at, rank, what, size, ...(isThere && { isThere }) })
    // On the edge itself there is an edge already, but a refine point still asks for its size.
    else if ((at === low || at === high) && size < Number.POSITIVE_INFINITY) {
      features.push({ at, rank: 0, what, size })
    }
  }
  if ((planned.refine?.length ?? 0) > mostRefinePoints) {
    throw new ModelError('grid.refine', `has more than ${mostRefinePoints} points`)
  }
  planned.refine?.forEach((point, index) => {
    const path = `grid.refine[${index}]`
    const at = requireFinite(axis === 0 ? point.x : point.y, `${path}.${axis === 0 ? 'x' : 'y'}`)
    const size = requirePositive(point.cellSize, `${path}.cellSize`)
    if (at < low || at > high) throw new ModelError(path, 'the refine point lies outside the extent')
    if (size < 1e-7 * (high - low)) {
      throw new ModelError(`${path}.cellSize`, 'is less than a ten-millionth of the extent')
    }
    add(at, 1, 'a refine point', size)
  })
  model.walls?.forEach((wall, index) => {
    const name = wall.name ? `the wall "${wall.name}"` : `wall no. ${index + 1}`
    for (const vertex of endsAndBends(wall.line)) add(vertex[axis], 2, name)
  })
  model.boundaries?.forEach((boundary, index) => {
    if (!boundary.line) return
    const name = boundary.name ? `the boundary "${boundary.name}"` : `boundary no. ${index + 1}`
    for (const vertex of endsAndBends(boundary.line)) add(vertex[axis], 3, name)
  })
  const ground = coverOf(model)
  const step = 1e-7 * (high - low)
  for (const polygon of ground.polygons) {
    if (!polygon) continue
    for (const [k, corner] of polygon.entries()) {
      const before = polygon[(k + polygon.length - 1) % polygon.length] as Position
      const after = polygon[(k + 1) % polygon.length] as Position
      if (turnAt(before, corner, after) >= leastTurn) {
        add(corner[axis], 3, 'a corner of the ground', Number.POSITIVE_INFINITY, () =>
          touchesHole(model, ground, corner, step),
        )
      }
      if (Math.abs(after[axis] - corner[axis]) <= 0.01 * step) {
        add(corner[axis], 4, 'an interface of the ground', Number.POSITIVE_INFINITY, () =>
          partsGround(ground, corner, after, axis, step),
        )
      }
    }
  }
  return features
}

/** The ends of an open line, and the vertices where it turns sharply. */
function endsAndBends(line: Position[]): Position[] {
  const first = line[0]
  const last = line[line.length - 1]
  if (!first || !last || line.length < 2) return []
  const isClosed = first[0] === last[0] && first[1] === last[1]
  return line.filter((vertex, k) => {
    if (k === 0 || k === line.length - 1) {
      if (!isClosed) return true
      return k === 0 && turnAt(line[line.length - 2] as Position, vertex, line[1] as Position) >= leastTurn
    }
    return turnAt(line[k - 1] as Position, vertex, line[k + 1] as Position) >= leastTurn
  })
}

/** Change of direction at `b` on the way from `a` to `c`, 0..180 degrees. */
function turnAt(a: Position, b: Position, c: Position): number {
  const [ux, uy, vx, vy] = [b[0] - a[0], b[1] - a[1], c[0] - b[0], c[1] - b[1]]
  return (Math.abs(Math.atan2(ux * vy - uy * vx, ux * vx + uy * vy)) * 180) / Math.PI
}

/** The ground's outlines, and how many vertices have been looked at so far. */
interface Cover {
  ground: Ground[]
  polygons: (Position[] | null)[]
  vertices: number
  lookUps: number
}

function coverOf({ ground }: Model): Cover {
  const polygons = ground.map((entry, index) =>
    entry.polygon ? checkedPolygon(entry.polygon, `ground[${index}].polygon`) : null,
  )
  const vertices = polygons.reduce((sum, polygon) => sum + (polygon?.length ?? 1), 0)
  return { ground, polygons, vertices, lookUps: 0 }
}

/** The last ground entry that covers a place, or -1. */
function entryAt(cover: Cover, x: number, y: number): number {
  cover.lookUps += cover.vertices
  if (cover.lookUps > mostLookUps) {
    throw new ModelError(
      'grid',
      'the ground has too many corners to plan a grid around: give columns and rows',
    )
  }
  for (let k = cover.polygons.length - 1; k >= 0; k--) {
    const polygon = cover.polygons[k]
    if (!polygon || isInside(polygon, x, y)) return k
  }
  return -1
}

/** Is there ground on some sides of a place, inside the extent, and none on others? */
function touchesHole({ extent }: Model, cover: Cover, [x, y]: Position, step: number): boolean {
  let covered = false
  let open = false
  const directions = 16
  for (let k = 0; k < directions; k++) {
    const angle = ((k + 0.37) * 2 * Math.PI) / directions
    const [px, py] = [x + step * Math.cos(angle), y + step * Math.sin(angle)]
    if (px < extent.x[0] || px > extent.x[1] || py < extent.y[0] || py > extent.y[1]) continue
    if (entryAt(cover, px, py) >= 0) covered = true
    else open = true
  }
  return covered && open
}

/** Is the ground different on the two sides of an axis-parallel side from `a` to `b`, anywhere along it? */
function partsGround(cover: Cover, a: Position, b: Position, axis: 0 | 1, step: number): boolean {
  const other = axis === 0 ? 1 : 0
  const from = Math.min(a[other], b[other])
  const to = Math.max(a[other], b[other])
  const cuts = [from, to]
  for (const polygon of cover.polygons) {
    for (const corner of polygon ?? [])
      if (corner[other] > from && corner[other] < to) cuts.push(corner[other])
  }
  cuts.sort((p, q) => p - q)
  for (let k = 0; k + 1 < cuts.length; k++) {
    const middle = ((cuts[k] as number) + (cuts[k + 1] as number)) / 2
    const beside = [a[axis] - step, a[axis] + step].map((place) =>
      axis === 0 ? entryAt(cover, place, middle) : entryAt(cover, middle, place),
    ) as [number, number]
    const [one, two] = [cover.ground[beside[0]], cover.ground[beside[1]]]
    if (one !== two && groundKey(one) !== groundKey(two)) return true
  }
  return false
}

/** Two entries with the same key are the same ground under another outline. */
function groundKey(entry: Ground | undefined): string {
  if (!entry) return ''
  const { material, base, top, layers } = entry
  return JSON.stringify([material, base, top, layers])
}

interface Edge {
  at: number
  size: number
}

/** The features as edges, rising; those too close to one of a better rank go onto it. */
function mergedFeatures(
  features: Feature[],
  planned: PlannedGrid,
  axis: 0 | 1,
  largest: number,
  low: number,
  high: number,
  warnings: Warning[],
): Edge[] {
  const refined = (planned.refine ?? []).map((point) => ({
    at: axis === 0 ? point.x : point.y,
    size: point.cellSize,
  }))
  function wantedSize(at: number): number {
    let size = Math.min(largest, high - low)
    for (const point of refined) size = Math.min(size, point.size + (growth - 1) * Math.abs(at - point.at))
    return size
  }
  const kept: (Edge & { what: string })[] = []
  const merged: string[] = []
  const letter = axis === 0 ? 'x' : 'y'
  const inOrder = [...features].sort((a, b) => a.rank - b.rank || a.at - b.at || a.size - b.size)
  for (const feature of inOrder) {
    const next = placeIn(kept, feature.at)
    const [below, above] = [kept[next - 1], kept[next]]
    const near = below && (!above || feature.at - below.at <= above.at - feature.at) ? below : above
    const distance = near ? Math.abs(near.at - feature.at) : Number.POSITIVE_INFINITY
    const wanted = wantedSize(feature.at)
    if (near && distance <= 1e-6 * wanted) {
      near.size = Math.min(near.size, feature.size)
      continue
    }
    if (feature.isThere && !feature.isThere()) continue
    if (!near || distance > tooClose * wanted) {
      kept.splice(next, 0, { at: feature.at, size: feature.size, what: feature.what })
      continue
    }
    near.size = Math.min(near.size, feature.size)
    merged.push(`${feature.what} at ${letter} = ${feature.at} onto ${near.what} at ${letter} = ${near.at}`)
  }
  if (merged.length > 0) {
    const more = merged.length > 4 ? `, and ${merged.length - 4} more` : ''
    warnings.push({
      code: 'edges-merged',
      severity: 'note',
      text: `Edges of the planned grid closer together than a tenth of the cells there were merged: ${merged.slice(0, 4).join('; ')}${more}. A refine point there keeps them apart.`,
    })
  }
  return kept
}

/** Where `at` belongs among rising edges. */
function placeIn(edges: Edge[], at: number): number {
  let low = 0
  let high = edges.length
  while (low < high) {
    const middle = (low + high) >> 1
    if ((edges[middle] as Edge).at < at) low = middle + 1
    else high = middle
  }
  return low
}

/** Stretch between two neighbouring edges. `first`, `last`: upper bounds of its outermost cells; `cap`: of any. */
interface Segment {
  from: number
  to: number
  length: number
  cap: number
  first: number
  last: number
}

/** Segments with bounds of their end cells that already know how far every narrow place reaches at this growth. */
function segmentsOf(edges: Edge[], largest: number): Segment[] {
  const segments: Segment[] = []
  for (let k = 0; k + 1 < edges.length; k++) {
    const [a, b] = [edges[k] as Edge, edges[k + 1] as Edge]
    const length = b.at - a.at
    const cap = Math.min(largest * (1 + 1e-9), length)
    segments.push({
      from: a.at,
      to: b.at,
      length,
      cap,
      first: Math.min(cap, a.size),
      last: Math.min(cap, b.size),
    })
  }
  // A cell at one end limits the one at the other: a geometric row from it has to fit between them.
  const across = (end: number, length: number) => (length * (growth - 1) + end) / growth
  for (let pass = 0; pass < 3; pass++) {
    for (let k = 0; k < segments.length; k++) {
      const segment = segments[k] as Segment
      const before = segments[k - 1]
      if (before) segment.first = Math.min(segment.first, growth * before.last)
      segment.last = Math.min(segment.last, across(segment.first, segment.length))
    }
    for (let k = segments.length - 1; k >= 0; k--) {
      const segment = segments[k] as Segment
      const after = segments[k + 1]
      if (after) segment.last = Math.min(segment.last, growth * after.first)
      segment.first = Math.min(segment.first, across(segment.last, segment.length))
    }
  }
  return segments
}

/**
 * Width of cell `i` of `n`: the level `c` where the bounds let it. The first cell lies between `a` and `b`, the last
 * between `lowLast` and `highLast`, and neighbours stay within the growth: the largest and the smallest such rows are
 * geometric from both ends, and any level between them keeps the rule.
 */
interface Row {
  n: number
  a: number
  b: number
  lowLast: number
  highLast: number
}

/** 1.3 ^ 1000 is more than any length needs and still a number. */
const farthest = 1000

function widthAt({ n, a, b, lowLast, highLast }: Row, i: number, c: number): number {
  const fromLow = growth ** Math.min(i, farthest)
  const fromHigh = growth ** Math.min(n - 1 - i, farthest)
  return Math.max(a / fromLow, lowLast / fromHigh, Math.min(c, b * fromLow, highLast * fromHigh))
}

/** Beyond this many cells from an end its bound no longer counts (1.3 ^ 220 = 1e25). */
const reach = 220

function lengthOf(row: Row, c: number): number {
  let sum = 0
  const ends = Math.min(reach, Math.ceil(row.n / 2))
  for (let i = 0; i < ends; i++) sum += widthAt(row, i, c)
  for (let i = Math.max(ends, row.n - reach); i < row.n; i++) sum += widthAt(row, i, c)
  return sum + Math.max(0, row.n - ends - reach) * c
}

/** Between `low`, where `isBelow` holds, and `high`, where it does not: the last value where it does. */
function lastBelow(low: number, high: number, isBelow: (value: number) => boolean): number {
  let [a, b] = [low, high]
  for (let step = 0; step < 60 && b - a > 1e-15 * b; step++) {
    const middle = 0.5 * (a + b)
    if (isBelow(middle)) a = middle
    else b = middle
  }
  return a
}

function fewestCells({ length, cap, first, last }: Segment): number {
  const fits = (n: number) =>
    lengthOf({ n, a: 0, b: first, lowLast: 0, highLast: last }, cap) >= length * (1 - 1e-12)
  let high = 1
  while (!fits(high)) {
    high *= 2
    if (high > 4 * largestCellCount) return high
  }
  let low = Math.floor(high / 2)
  while (high - low > 1) {
    const middle = (low + high) >> 1
    if (fits(middle)) high = middle
    else low = middle
  }
  return high
}

/** A way to fill the segments up to one of them: `count` cells, the last of them between `low` and `high` wide. */
interface State {
  count: number
  low: number
  high: number
  n: number
  /** Bounds of the segment's first cell that this way was found with. */
  a: number
  b: number
  before: State | null
}

interface Plan {
  count: number
  states: State[]
}

/**
 * The fewest cells, by dynamic programming along the axis: what one segment leaves to the next is only the range of
 * widths its last cell may have. Rows with a given sum between a smallest and a largest row form a convex set, so that
 * range is an interval.
 */
function planOf(segments: Segment[]): Plan {
  for (let spare = 2; spare <= 256; spare *= 4) {
    let states: State[] = [
      { count: 0, low: 0, high: Number.POSITIVE_INFINITY, n: 0, a: 0, b: 0, before: null },
    ]
    for (const segment of segments) {
      const fewest = fewestCells(segment)
      const next: State[] = []
      for (const before of states) {
        for (let n = fewest; n <= fewest + spare; n++) {
          const state = stateAfter(segment, before, n)
          if (state) next.push(state)
        }
      }
      states = worthKeeping(next)
    }
    const best = states[0]
    if (!best) continue
    const chain: State[] = []
    for (let state: State | null = best; state && state.n > 0; state = state.before) chain.unshift(state)
    return { count: best.count, states: chain }
  }
  throw new ModelError('grid', 'its edges lie so that no cells with a growth of at most 1.3 fit between them')
}

function stateAfter(segment: Segment, before: State, n: number): State | null {
  const { length, cap } = segment
  const a = before.low / growth
  const b = Math.min(segment.first, cap, before.high * growth)
  if (a > b) return null
  const range = rangeOfLast(segment, n, a, b)
  return range && { count: before.count + n, low: range[0], high: range[1], n, a, b, before }
  function rangeOfLast(
    { last }: Segment,
    cells: number,
    least: number,
    most: number,
  ): [number, number] | null {
    const top = Math.min(last, cap, most * growth ** Math.min(cells - 1, farthest))
    if (cells === 1) return length >= least && length <= top * (1 + 1e-12) ? [length, length] : null
    const bottom = least / growth ** Math.min(cells - 1, farthest)
    const longest = (value: number) => lengthOf({ n: cells, a: 0, b: most, lowLast: 0, highLast: value }, cap)
    const shortest = (value: number) => lengthOf({ n: cells, a: least, b: 0, lowLast: value, highLast: 0 }, 0)
    if (longest(top) < length * (1 - 1e-12) || shortest(bottom) > length) return null
    const high = shortest(top) <= length ? top : lastBelow(bottom, top, (value) => shortest(value) <= length)
    const low = lastBelow(bottom, top, (value) => longest(value) < length)
    return low <= high ? [low, high] : null
  }
}

/** Fewest cells first; a way that another one includes with no more cells is of no use. */
function worthKeeping(states: State[]): State[] {
  const sorted = [...states].sort((p, q) => p.count - q.count || q.high - q.low - (p.high - p.low))
  const kept: State[] = []
  for (const state of sorted) {
    const covered = kept.some((other) => other.low <= state.low && other.high >= state.high)
    if (!covered) kept.push(state)
    if (kept.length >= 40) break
  }
  return kept
}

/** Fills the segments from the last to the first, each as evenly as its ends allow. */
function edgesOf(segments: Segment[], plan: Plan): Float64Array {
  const edges = new Float64Array(plan.count + 1)
  let end = plan.count
  let wanted: [number, number] = [0, Number.POSITIVE_INFINITY]
  for (let k = segments.length - 1; k >= 0; k--) {
    const { from, to, length, cap, last } = segments[k] as Segment
    const { n, a, b, low, high } = plan.states[k] as State
    const free: Row = { n, a, b, lowLast: 0, highLast: Math.min(last, cap) }
    const even = widthAt(free, n - 1, levelOf(free, length, cap))
    const chosen = Math.min(Math.max(even, low, wanted[0]), high, wanted[1])
    const row: Row = { n, a, b, lowLast: chosen, highLast: chosen }
    const level = levelOf(row, length, cap)
    edges[end] = to
    let sum = 0
    // Rounding of the sum is spread over the segment, so that its ends are exact.
    const stretch = length / lengthOf(row, level)
    for (let i = 0; i < n - 1; i++) {
      sum += widthAt(row, i, level)
      edges[end - n + 1 + i] = from + sum * stretch
    }
    end -= n
    const first = widthAt(row, 0, level)
    wanted = [first / growth, first * growth]
  }
  edges[0] = (segments[0] as Segment).from
  return edges
}

function levelOf(row: Row, length: number, cap: number): number {
  if (lengthOf(row, cap) <= length) return cap
  return lastBelow(0, cap, (level) => lengthOf(row, level) <= length)
}

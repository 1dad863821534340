import type { Outcome } from './balancer'
import { atFaceHead, type Discretised, type Exchange } from './discretise'
import { type Face, faceBetweenColumns, faceBetweenRows, faceOf } from './faces'
import type { Boundary, Position } from './model'
import { headAt } from './points'
import type { GradientResult } from './result'
import { carriedHeads } from './water-table'

/** A face through which water leaves the ground upwards. Heads and elevations are in the model's datum. */
interface Exit {
  exchange: Exchange
  face: Face
  /** Head at the face. */
  head: number
  /** Head lost between the centre of the cell below and the face, for each unit of length. */
  gradient: number
}

/** What the gradients of one section are read from. */
interface Reading {
  d: Discretised
  headBelow: (x: number, y: number) => number | null
}

/** Without a wall beside it, the mean is over this share of the ground's depth below the boundary. */
const depthShare = 0.1

/**
 * The gradients at which water leaves a vertical section upwards, at a ground surface or a dig level, one row a
 * fixed-head or seepage boundary along the edge of the ground. The mean is the head lost over the embedment of the
 * wall beside the boundary, averaged over half of that embedment beside the wall (Terzaghi 1943), at the wall where it
 * is greater; without a wall over a tenth of the ground's depth, around the steepest place. The local maximum depends
 * on the size of cells where it is singular. `inflow`: into the ground, by outer face.
 */
export function gradientsOf(d: Discretised, outcome: Outcome, inflow: Map<number, number>): GradientResult[] {
  const { flow, heads, saturation } = outcome
  const carried = saturation ? carriedHeads(d, heads, saturation) : heads
  const reading: Reading = {
    d,
    headBelow(x, y) {
      const head = headAt(flow, carried, inflow, x, y)
      return typeof head === 'number' && Number.isFinite(head) ? head + d.reference : null
    },
  }
  const results: GradientResult[] = []
  for (const [index, boundary] of (d.model.boundaries ?? []).entries()) {
    const exits = exitsOf(d, outcome, index)
    if (exits.length > 0) results.push(gradientOf(reading, boundary, exits))
  }
  return results
}

/** The faces of one boundary through which water leaves upwards, from west to east. */
function exitsOf(d: Discretised, { heads, saturation }: Outcome, index: number): Exit[] {
  const exits: Exit[] = []
  for (const exchange of d.exchanges) {
    if (exchange.index !== index || exchange.owner !== 'boundaries') continue
    if (!atFaceHead(exchange) || exchange.axis !== 'y') continue
    const { cell } = exchange
    const face = faceOf(d.grid, exchange.face)
    if (face.low !== cell || (saturation?.[cell] ?? 1) < 1) continue
    // Water that seeps out stands at the pressure of the air.
    const elevation = face.middle[1]
    const given = exchange.head + d.reference
    const head = d.model.flow === 'free surface' ? Math.max(given, elevation) : given
    const gradient = ((heads[cell] as number) + d.reference - head) / exchange.half
    if (gradient > 0) exits.push({ exchange, face, head, gradient })
  }
  return exits.sort((a, b) => a.face.middle[0] - b.face.middle[0])
}

function gradientOf(reading: Reading, boundary: Boundary, exits: Exit[]): GradientResult {
  const { d } = reading
  const steepest = exits.reduce((best, exit) => (exit.gradient > best.gradient ? exit : best))
  const means = exits.flatMap((exit) => [
    besideWall(reading, exits, exit, -1),
    besideWall(reading, exits, exit, 1),
  ])
  const beside = means.reduce((best, mean) => (mean && (!best || mean.mean > best.mean) ? mean : best), null)
  const { mean, overDepth } = beside ?? aroundSteepest(reading, exits, steepest)
  return {
    name: boundary.name,
    mean,
    overDepth,
    localMaximum: steepest.gradient,
    at: steepest.face.middle,
    cellSize: 2 * steepest.exchange.half,
    singular: isSingular(d, exits, steepest, -1) || isSingular(d, exits, steepest, 1),
  }
}

interface Mean {
  mean: number
  overDepth: number
}

/** The mean at a wall that bounds the cell under an exit to its west (-1) or east (1); null: there is none. */
function besideWall(reading: Reading, exits: Exit[], exit: Exit, side: -1 | 1): Mean | null {
  const { d } = reading
  const face = upright(d, exit.exchange.cell, side)
  if (!((d.wallShare[face] as number) > 0)) return null
  const { middle } = faceOf(d.grid, face)
  const toe = toeAt(d, middle)
  const depth = exit.face.middle[1] - toe
  if (!(depth > 0)) return null
  const from = middle[0]
  const mean = meanOver(reading, exits, from, from - side * (depth / 2), exit.face.middle[1], depth)
  return mean === null ? null : { mean, overDepth: depth }
}

/** The face on the west (-1) or east (1) side of a cell. */
function upright(d: Discretised, cell: number, side: -1 | 1): number {
  const j = Math.floor(cell / d.grid.columns)
  return faceBetweenColumns(d.grid, cell - j * d.grid.columns + (side > 0 ? 1 : 0), j)
}

/** The lowest end of the wall that passes nearest a place. */
function toeAt(d: Discretised, [x, y]: Position): number {
  let toe = Number.NaN
  let nearest = Number.POSITIVE_INFINITY
  for (const wall of d.model.walls ?? []) {
    for (let s = 0; s + 1 < wall.line.length; s++) {
      const [a, b] = [wall.line[s] as Position, wall.line[s + 1] as Position]
      const square = (b[0] - a[0]) ** 2 + (b[1] - a[1]) ** 2
      const along = square === 0 ? 0 : ((x - a[0]) * (b[0] - a[0]) + (y - a[1]) * (b[1] - a[1])) / square
      const t = Math.min(1, Math.max(0, along))
      const distance = Math.hypot(a[0] + t * (b[0] - a[0]) - x, a[1] + t * (b[1] - a[1]) - y)
      if (distance >= nearest) continue
      nearest = distance
      toe = Math.min(...wall.line.map((vertex) => vertex[1]))
    }
  }
  return toe
}

function aroundSteepest(reading: Reading, exits: Exit[], steepest: Exit): Mean {
  const { d } = reading
  const { columns, yEdges } = d.grid
  const [x, y] = steepest.face.middle
  let j = Math.floor(steepest.exchange.cell / columns)
  const i = steepest.exchange.cell - j * columns
  const cellHeight = 2 * steepest.exchange.half
  while (j > 0 && d.active[(j - 1) * columns + i] === 1) j--
  const ground = y - (yEdges[j] as number)
  const overDepth = Math.min(ground, Math.max(2 * cellHeight, depthShare * ground))
  const mean = meanOver(reading, exits, x - overDepth / 4, x + overDepth / 4, y, overDepth)
  return { mean: mean ?? steepest.gradient, overDepth }
}

/**
 * (Mean head at `depth` below the level `y` - mean head at the faces) / depth, over the part of [from, to] where water
 * leaves at that level; null where nothing can be read.
 */
function meanOver(
  { d, headBelow }: Reading,
  exits: Exit[],
  from: number,
  to: number,
  y: number,
  depth: number,
): number | null {
  const [west, east] = [Math.min(from, to), Math.max(from, to)]
  let length = 0
  let loss = 0
  for (const { face, head } of exits) {
    if (Math.abs(face.middle[1] - y) > 1e-9 * Math.max(1, Math.abs(y))) continue
    const half = face.length / 2
    const low = Math.max(west, face.middle[0] - half)
    const high = Math.min(east, face.middle[0] + half)
    if (high <= low) continue
    const below = headBelow((low + high) / 2, Math.max(y - depth, d.grid.yEdges[0] as number))
    if (below === null) continue
    length += high - low
    loss += (high - low) * (below - head)
  }
  return length > 0 ? loss / length / depth : null
}

/**
 * Does the gradient grow without limit towards one end of the steepest face? Near a corner of the ground where a held
 * head meets a no-flow edge it goes with r^(pi / 2 angle - 1), where two held edges meet with r^(pi / angle - 1): it is
 * finite up to 90 and 180 degrees. The neighbouring face counts too, as the steepest need not be the last.
 */
function isSingular(d: Discretised, exits: Exit[], steepest: Exit, side: -1 | 1): boolean {
  const { columns, rows } = d.grid
  let exit: Exit | undefined = steepest
  for (let step = 0; step < 2 && exit; step++) {
    const cell: number = exit.exchange.cell
    const i: number = (cell % columns) + side
    // A wall or the end of the ground makes a right angle with the surface.
    if (i < 0 || i >= columns || (d.wallShare[upright(d, cell, side)] as number) > 0) return false
    const beside: number = cell + side
    if (d.active[beside] !== 1) return false
    const above = beside + columns
    if (above < columns * rows && d.active[above] === 1) return true
    const top = faceBetweenRows(d.grid, i, Math.floor(beside / columns) + 1)
    const next: Exchange | undefined = d.exchanges.find(
      (exchange) => exchange.face === top && atFaceHead(exchange),
    )
    if (!next) return true
    if (Math.abs(next.head - exit.exchange.head) > 0.5 * exit.gradient * exit.exchange.half) return true
    exit = exits.find(({ exchange }) => exchange === next)
  }
  return false
}

import { type Grid, intervalOf } from './grid'
import type { Position, Wall } from './model'

/**
 * Ends of walls inside the ground. Heads beside a thin wall's end go with the root of the distance, which no cell size
 * resolves: on even cells, a wall along the faces acts as if it were longer by
 *
 *   dy root(1 + rho) / 4,   rho = (Ky / Kx) (dx / dy)^2,   Kx, dx across the wall, Ky, dy along it
 *
 * (0.354 of a square cell), and a last face that lets the share p of its open conductance pass shortens it by
 *
 *   x = beta / (s + beta),   beta = 2 p / (1 - p),   s = 2 root(rho) / (root(1 + rho) + 1)
 *
 * of its length. Both follow from the half-endless wall on an endless even grid, solved by the method of Wiener and Hopf
 * (Noble 1958, Methods based on the Wiener-Hopf technique): with the five-point balance the flow through the line of
 * the wall and the head there are related, by wave number k along it, by
 * 2 root(rho) |sin(k/2)| / root(1 + rho sin^2(k/2)), which factorises in closed form; its term of first order in k is
 * the shift. So a wall is taken shorter by the first, and its last face in part by the second: the discharge under a
 * sheet pile then converges with second order where it was first.
 */
export interface Tip {
  /** The wall's line with the ends that stand free in the ground moved back. */
  line: Position[]
  start: boolean
  end: boolean
}

/** What a wall's end stands in. */
export interface TipGround {
  grid: Grid
  isGround: (x: number, y: number) => boolean
  /** Conductivity along x and y at a place. */
  conductivity: (x: number, y: number) => { x: number; y: number }
}

/**
 * Moves back each end of a wall that is `free` (meets no other wall), lies on a straight stretch along an axis, and
 * beyond which the ground goes on. A wall that leaks moves back less: by the share of its resistance in that of wall
 * and cells together, as without a wall there is nothing singular.
 */
export function tipsOf(wall: Wall, free: [start: boolean, end: boolean], ground: TipGround): Tip {
  const last = wall.line.length - 1
  const line = [...wall.line]
  const moved = [0, last].map((vertex, k) => {
    const next = wall.line[vertex === 0 ? 1 : last - 1] as Position
    const place = free[k] ? movedBack(wall, wall.line[vertex] as Position, next, ground) : null
    if (place) line[vertex] = place
    return place !== null
  })
  return { line, start: moved[0] as boolean, end: moved[1] as boolean }
}

function movedBack(wall: Wall, tip: Position, next: Position, ground: TipGround): Position | null {
  const { grid } = ground
  const along = tip[0] === next[0] ? 1 : tip[1] === next[1] ? 0 : -1
  if (along < 0) return null
  const across = along === 0 ? 1 : 0
  const length = Math.abs(next[along as 0] - tip[along as 0])
  if (length === 0) return null
  const inward = Math.sign(next[along as 0] - tip[along as 0])
  const edges = along === 0 ? grid.xEdges : grid.yEdges
  const size = widthBeside(edges, tip[along as 0], inward)
  const gap = distanceOfCentres(along === 0 ? grid.yEdges : grid.xEdges, tip[across])
  if (size === 0 || gap === 0) return null
  for (const side of [-0.5, 0.5]) {
    const beyond = placeAt(along as 0, tip[along as 0] - 0.5 * inward * size, tip[across] + side * gap)
    if (!ground.isGround(...beyond)) return null
  }
  const beside = placeAt(along as 0, tip[along as 0] + 0.5 * inward * size, tip[across] + 0.5 * gap)
  const k = ground.conductivity(...beside)
  const [kAcross, kAlong] = along === 0 ? [k.y, k.x] : [k.x, k.y]
  const rho = aspect(kAcross, kAlong, gap, size)
  const resistance = wall.k === 0 ? Number.POSITIVE_INFINITY : (wall.thickness / wall.k) * kAcross
  const closed = resistance === Number.POSITIVE_INFINITY ? 1 : resistance / (resistance + gap)
  const shift = Math.min(0.5 * length, (closed * size * Math.sqrt(1 + rho)) / 4)
  return placeAt(along as 0, tip[along as 0] + inward * shift, tip[across])
}

function placeAt(along: 0 | 1, a: number, b: number): [number, number] {
  return along === 0 ? [a, b] : [b, a]
}

/** Width of the cell beside `value`, on the side that `direction` points to; 0 outside. */
function widthBeside(edges: Float64Array, value: number, direction: number): number {
  const last = edges.length - 1
  let k = intervalOf(edges, value)
  if (direction < 0 && k > 0 && edges[k] === value) k--
  if (k < 0 || k >= last) return 0
  return (edges[k + 1] as number) - (edges[k] as number)
}

/** Distance between the two cell centres around `value`; 0 beyond the outermost. */
function distanceOfCentres(edges: Float64Array, value: number): number {
  const k = intervalOf(edges, value)
  if (k < 0 || k >= edges.length - 1) return 0
  const middle = ((edges[k] as number) + (edges[k + 1] as number)) / 2
  const low = value > middle ? k : k - 1
  const [a, b, c] = [edges[low], edges[low + 1], edges[low + 2]]
  return a === undefined || b === undefined || c === undefined ? 0 : (c - a) / 2
}

function aspect(kAcross: number, kAlong: number, dx: number, dy: number): number {
  return (kAlong / kAcross) * (dx / dy) ** 2
}

/** Share of the wall's last face that has to be closed where the wall covers `covered` (0..1) of its length. */
export function closedShare(
  covered: number,
  kAcross: number,
  kAlong: number,
  dx: number,
  dy: number,
): number {
  const rho = aspect(kAcross, kAlong, dx, dy)
  const s = (2 * Math.sqrt(rho)) / (Math.sqrt(1 + rho) + 1)
  const x = 1 - covered
  return 1 - (s * x) / (2 * covered + s * x)
}

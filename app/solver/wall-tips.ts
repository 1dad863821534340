import { faceOf } from './faces'
import { type Grid, intervalOf } from './grid'
import type { CrossedFace } from './line-on-grid'
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
 *
 * A wall oblique to the grid ends on one of its stairs: the shift is counted from the stair's outer corner, and stairs
 * are opened, the last of them in part, until what is left ends where the wall does. Its size, 0.354 + 0.3 |sin 2a| of a
 * cell at an angle a, was found by experiment on a plate across even flow (Lamb 1932, article 71); it leaves an error of
 * a quarter of a cell in the wall's length, so first order remains.
 */
export interface Tip {
  /** The wall's line with the ends that stand free in the ground moved back, where they lie along an axis. */
  line: Position[]
  start: TipKind
  end: TipKind
}

/** 'tight': meets something, or nothing lies beyond. 'along': on a stretch along an axis. 'oblique': on stairs. */
type TipKind = 'tight' | 'along' | 'oblique'

/** What a wall's end stands in. */
export interface TipGround {
  grid: Grid
  isGround: (x: number, y: number) => boolean
  /** Ground that no boundary holds at a head. */
  isFree: (x: number, y: number) => boolean
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
  const kinds = [0, last].map((vertex, k): TipKind => {
    const tip = wall.line[vertex] as Position
    const next = wall.line[vertex === 0 ? 1 : last - 1] as Position
    if (!free[k] || !goesOn(tip, next, ground)) return 'tight'
    if (tip[0] !== next[0] && tip[1] !== next[1]) return 'oblique'
    line[vertex] = movedBack(wall, tip, next, ground)
    return 'along'
  })
  return { line, start: kinds[0] as TipKind, end: kinds[1] as TipKind }
}

/** Is there ground on both sides of the wall's line, half a cell beyond its end, that may have any head? */
function goesOn(tip: Position, next: Position, { grid, isFree }: TipGround): boolean {
  const length = Math.hypot(tip[0] - next[0], tip[1] - next[1])
  if (length === 0) return false
  const [ux, uy] = [(tip[0] - next[0]) / length, (tip[1] - next[1]) / length]
  const half = [0.5 * widthBeside(grid.xEdges, tip[0], ux), 0.5 * widthBeside(grid.yEdges, tip[1], uy)]
  const [hx, hy] = half as [number, number]
  if (hx === 0 || hy === 0) return false
  return [1, -1].every((side) => {
    return isFree(tip[0] + hx * (ux - side * uy), tip[1] + hy * (uy + side * ux))
  })
}

function movedBack(wall: Wall, tip: Position, next: Position, ground: TipGround): Position {
  const { grid } = ground
  const along = tip[0] === next[0] ? 1 : 0
  const across = along === 0 ? 1 : 0
  const length = Math.abs(next[along] - tip[along])
  const inward = Math.sign(next[along] - tip[along])
  const size = widthBeside(along === 0 ? grid.xEdges : grid.yEdges, tip[along], inward)
  const gap = distanceOfCentres(along === 0 ? grid.yEdges : grid.xEdges, tip[across])
  if (size === 0 || gap === 0) return tip
  const beside = placeAt(along, tip[along] + 0.5 * inward * size, tip[across] + 0.5 * gap)
  if (!ground.isGround(...beside)) return tip
  const k = ground.conductivity(...beside)
  const [kAcross, kAlong] = along === 0 ? [k.y, k.x] : [k.x, k.y]
  const rho = aspect(kAcross, kAlong, gap, size)
  const shift = Math.min(0.5 * length, (closedness(wall, kAcross, gap) * size * Math.sqrt(1 + rho)) / 4)
  return placeAt(along, tip[along] + inward * shift, tip[across])
}

/** Share of a wall's resistance in that of wall and cells together. */
function closedness(wall: Wall, kAcross: number, gap: number): number {
  if (wall.k === 0) return 1
  const resistance = (wall.thickness / wall.k) * kAcross
  return resistance / (resistance + gap)
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

/** Opens the faces at a wall's free ends so far that it ends where its line does. Shares change, none to zero. */
export function closeTips(wall: Wall, tips: Tip, ground: TipGround, faces: CrossedFace[]): CrossedFace[] {
  const last = wall.line.length - 2
  const [tip, end] = [wall.line[0] as Position, wall.line[last + 1] as Position]
  let kept = faces
  if (tips.start === 'along') closeStraight(kept, ground, 0, 0)
  if (tips.end === 'along') closeStraight(kept, ground, last, 1)
  if (tips.start === 'oblique') kept = closeStairs(wall, kept, ground, 0, tip, wall.line[1] as Position)
  if (tips.end === 'oblique') kept = closeStairs(wall, kept, ground, last, end, wall.line[last] as Position)
  return kept
}

function closeStraight(faces: CrossedFace[], ground: TipGround, segment: number, t: number): void {
  for (const entry of faces) {
    if (entry.at.segment !== segment || entry.at.t !== t) continue
    entry.share = shareOf(entry.share, entry.face, ground)
  }
}

function shareOf(covered: number, face: number, ground: TipGround): number {
  const { axis, middle, length, lowHalf, highHalf } = faceOf(ground.grid, face)
  const k = ground.conductivity(middle[0], middle[1])
  const [across, along] = axis === 'x' ? [k.x, k.y] : [k.y, k.x]
  return closedShare(covered, across, along, lowHalf + highHalf, length)
}

function closeStairs(
  wall: Wall,
  faces: CrossedFace[],
  ground: TipGround,
  segment: number,
  tip: Position,
  next: Position,
): CrossedFace[] {
  const length = Math.hypot(tip[0] - next[0], tip[1] - next[1])
  const out = [(tip[0] - next[0]) / length, (tip[1] - next[1]) / length] as const
  const stairShift = 0.6 * Math.abs(out[0] * out[1])
  const stairs = faces
    .filter((entry) => entry.at.segment === segment)
    .map((entry) => {
      const { axis, middle, length: side, lowHalf, highHalf } = faceOf(ground.grid, entry.face)
      const middleAt = (middle[0] - tip[0]) * out[0] + (middle[1] - tip[1]) * out[1]
      const extent = side * Math.abs(axis === 'x' ? out[1] : out[0])
      const k = ground.conductivity(middle[0], middle[1])
      const closed = closedness(wall, axis === 'x' ? k.x : k.y, lowHalf + highHalf)
      const shift = closed * (Math.SQRT2 / 4 + stairShift) * Math.sqrt(side * (lowHalf + highHalf))
      return { entry, extent, excess: middleAt + extent / 2 + shift }
    })
    .sort((p, q) => q.excess - p.excess)
  const opened = new Set<CrossedFace>()
  for (const { entry, extent, excess } of stairs.slice(0, 4)) {
    if (excess <= 0) break
    if (excess < extent) {
      entry.share = shareOf(1 - excess / extent, entry.face, ground)
      break
    }
    opened.add(entry)
  }
  return opened.size === faces.length ? faces : faces.filter((entry) => !opened.has(entry))
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

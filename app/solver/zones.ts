import { solveDense } from './dense'
import type { CornerMatrix, Matrix } from './flow'

/**
 * Zones of cells that hang together by strong links but only weakly with the rest: inside a wall, in a channel, over
 * a drain that is not reached. Their common level is what relaxation is slowest at, so it is corrected by itself: one
 * balance a zone, solved directly (additive correction, Settari & Aziz 1973; Nicolaides 1987 calls it deflation).
 */
export interface Zones {
  zoneOf: Int32Array
  count: number
  /** The slowest mode, as far as it is not a level of zones, in the system's unknown; null: it adds nothing to them. */
  mode: Float64Array | null
  /** Balance of zone k for a unit rise of head in zone l, row by row; the mode, if any, comes last. */
  matrix: number[][]
  /** The smallest share of its diagonals that a zone exchanges with the rest: about the eigenvalue of its own mode. */
  slowest: number
}

/** A link weaker than this share of the stronger cell's diagonal does not hold its cells together. */
const weakLink = 2e-3
const mostZones = 250

/**
 * Finds the zones of an unscaled matrix and joins the slowest mode to them, where it is given and
 * stays slower than `slow` (an eigenvalue) beside them. Null when there are too many zones, or
 * just one and `always` is not set: then nothing needs correcting.
 */
export function zonesOf(
  matrix: Matrix,
  free: (cell: number) => boolean,
  nx: number,
  ny: number,
  slow: number,
  slowestMode: Float64Array | null,
  always: boolean,
): Zones | null {
  const { diag, west, east, south, north, corners, weight } = matrix
  const count = nx * ny
  const zoneOf = new Int32Array(count).fill(-1)
  const queue = new Int32Array(count)
  // Diagonals and links are per change of the unknown; times the weight they are per change of head.
  const strength = (cell: number) => (diag[cell] as number) * (weight[cell] as number)
  function joined(a: number, b: number, link: number): boolean {
    return link > weakLink * Math.max(strength(a), strength(b))
  }
  let zones = 0
  for (let seed = 0; seed < count; seed++) {
    if ((zoneOf[seed] as number) >= 0 || !free(seed)) continue
    let length = 0
    queue[length++] = seed
    zoneOf[seed] = zones
    for (let k = 0; k < length; k++) {
      const c = queue[k] as number
      const i = c % nx
      function visit(next: number, link: number): void {
        if ((zoneOf[next] as number) >= 0 || !free(next) || !joined(c, next, link)) return
        zoneOf[next] = zones
        queue[length++] = next
      }
      if (i > 0) visit(c - 1, (west[c] as number) * (weight[c - 1] as number))
      if (i < nx - 1) visit(c + 1, (east[c] as number) * (weight[c + 1] as number))
      if (c >= nx) visit(c - nx, (south[c] as number) * (weight[c - nx] as number))
      if (c < count - nx) visit(c + nx, (north[c] as number) * (weight[c + nx] as number))
      if (corners) {
        eachCorner(corners, c, i, nx, count, (next, link) => visit(next, link * (weight[next] as number)))
      }
    }
    zones++
    if (zones > mostZones) return null
  }
  if (zones === 0 || (zones === 1 && !always)) return null
  const mass = new Float64Array(zones)
  const part = new Float64Array(zones)
  for (let c = 0; c < count; c++) {
    const zone = zoneOf[c] as number
    if (zone < 0) continue
    mass[zone] = (mass[zone] as number) + strength(c)
    if (slowestMode) {
      part[zone] = (part[zone] as number) + (diag[c] as number) * (slowestMode[c] as number)
    }
  }
  // What the zones' levels can do already is taken out of the mode.
  const mode = new Float64Array(count)
  let whole = 0
  let left = 0
  for (let c = 0; c < count; c++) {
    const zone = zoneOf[c] as number
    if (zone < 0) continue
    const own = slowestMode ? (slowestMode[c] as number) : 0
    const rest = own - ((part[zone] as number) / (mass[zone] as number)) * (weight[c] as number)
    mode[c] = rest
    whole += (diag[c] as number) * own * own
    left += (diag[c] as number) * rest * rest
  }
  const withMode = left > 1e-12 * whole
  const size = zones + (withMode ? 1 : 0)
  const rows = Array.from({ length: size }, () => Array.from({ length: size }, () => 0))
  for (let c = 0; c < count; c++) {
    const own = zoneOf[c] as number
    if (own < 0) continue
    function add(cell: number, value: number): void {
      const zone = zoneOf[cell] as number
      if (zone < 0) return
      raise(rows[own] as number[], zone, value * (weight[cell] as number))
      if (!withMode) return
      const last = rows[zones] as number[]
      raise(rows[own] as number[], zones, value * (mode[cell] as number))
      raise(last, zone, (mode[c] as number) * value * (weight[cell] as number))
      raise(last, zones, (mode[c] as number) * value * (mode[cell] as number))
    }
    const i = c % nx
    add(c, diag[c] as number)
    if (i > 0) add(c - 1, -(west[c] as number))
    if (i < nx - 1) add(c + 1, -(east[c] as number))
    if (c >= nx) add(c - nx, -(south[c] as number))
    if (c < count - nx) add(c + nx, -(north[c] as number))
    if (corners) eachCorner(corners, c, i, nx, count, (next, link) => add(next, -link))
  }
  let slowest = Number.POSITIVE_INFINITY
  for (let k = 0; k < zones; k++) {
    slowest = Math.min(slowest, ((rows[k] as number[])[k] as number) / (mass[k] as number))
  }
  if (!withMode) return { zoneOf, count: zones, mode: null, matrix: rows, slowest }
  // What is left once the zones have found their best levels for it: still slow, or only the mode's rough edges?
  const levels = rows.slice(0, zones).map((row) => row.slice(0, zones))
  const pull = rows.slice(0, zones).map((row) => row[zones] as number)
  const taken = solveDense(levels, pull)
  const last = rows[zones] as number[]
  const energy = taken.reduce((sum, value, k) => sum - value * (pull[k] as number), last[zones] as number)
  let rest = 0
  for (let c = 0; c < count; c++) {
    const zone = zoneOf[c] as number
    if (zone < 0) continue
    mode[c] = (mode[c] as number) - (taken[zone] as number) * (weight[c] as number)
    rest += (diag[c] as number) * (mode[c] as number) ** 2
  }
  if (!(energy > 0 && energy < slow * rest))
    return { zoneOf, count: zones, mode: null, matrix: levels, slowest }
  // The mode no longer moves the zones' balances, nor they its own.
  for (let k = 0; k < zones; k++) {
    ;(rows[k] as number[])[zones] = 0
    last[k] = 0
  }
  last[zones] = energy
  return { zoneOf, count: zones, mode, matrix: rows, slowest }
}

function eachCorner(
  { southWest, southEast, northWest, northEast }: CornerMatrix,
  c: number,
  i: number,
  nx: number,
  count: number,
  visit: (next: number, link: number) => void,
): void {
  if (i > 0 && c >= nx) visit(c - nx - 1, southWest[c] as number)
  if (i < nx - 1 && c >= nx) visit(c - nx + 1, southEast[c] as number)
  if (i > 0 && c < count - nx) visit(c + nx - 1, northWest[c] as number)
  if (i < nx - 1 && c < count - nx) visit(c + nx + 1, northEast[c] as number)
}

function raise(row: number[], k: number, by: number): void {
  row[k] = (row[k] as number) + by
}

import type { Matrix } from './flow'

/**
 * Zones of cells that hang together by strong links but only weakly with the rest: inside a wall, in a channel, over
 * a drain that is not reached. Their common level is what relaxation is slowest at, so it is corrected by itself: one
 * balance a zone, solved directly (additive correction, Settari & Aziz 1973; Nicolaides 1987 calls it deflation).
 */
export interface Zones {
  zoneOf: Int32Array
  count: number
  /** Balance of zone k for a unit rise of head in zone l, row by row. */
  matrix: number[][]
  /** The smallest share of its diagonals that a zone exchanges with the rest: about the eigenvalue of its own mode. */
  slowest: number
}

/** A link weaker than this share of the stronger cell's diagonal does not hold its cells together. */
const weakLink = 2e-3
const mostZones = 250

/**
 * Finds the zones of an unscaled matrix, or null when there is only one or too many to be worth it. With `always` a
 * single zone is taken too.
 */
export function zonesOf(
  matrix: Matrix,
  free: (cell: number) => boolean,
  nx: number,
  ny: number,
  always: boolean,
): Zones | null {
  const { diag, west, east, south, north, weight } = matrix
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
    }
    zones++
    if (zones > mostZones) return null
  }
  if (zones === 0 || (zones === 1 && !always)) return null
  const mass = new Float64Array(zones)
  const rows = Array.from({ length: zones }, () => new Array<number>(zones).fill(0))
  for (let c = 0; c < count; c++) {
    const own = zoneOf[c] as number
    if (own < 0) continue
    const row = rows[own] as number[]
    function add(cell: number, value: number): void {
      const zone = zoneOf[cell] as number
      if (zone >= 0) row[zone] = (row[zone] as number) + value * (weight[cell] as number)
    }
    const i = c % nx
    mass[own] = (mass[own] as number) + strength(c)
    add(c, diag[c] as number)
    if (i > 0) add(c - 1, -(west[c] as number))
    if (i < nx - 1) add(c + 1, -(east[c] as number))
    if (c >= nx) add(c - nx, -(south[c] as number))
    if (c < count - nx) add(c + nx, -(north[c] as number))
  }
  const slowest = Math.min(...rows.map((row, k) => (row[k] as number) / (mass[k] as number)))
  return { zoneOf, count: zones, matrix: rows, slowest }
}

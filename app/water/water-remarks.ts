import type { Vertex } from '~/book/field'
import type { Row } from '~/book/row'
import type { Zone } from '~/ground/ground'
import { addRemark, type Remarks, remarkRepeatedNames } from '~/ground/ground-remarks'
import { convert, type ProjectUnits } from '~/units'
import type { Boundary, RechargeZone, Wall, Well } from './water'

/** Whether a position lies inside a polygon (crossing count of a ray along x; an edge counts by chance). */
export function liesInside([x, y]: Vertex, ring: readonly Vertex[]): boolean {
  let inside = false
  for (let i = 0; i < ring.length; i++) {
    const [x1, y1] = ring[i] as Vertex
    const [x2, y2] = ring[(i + 1) % ring.length] as Vertex
    if (y1 > y !== y2 > y && x < ((x2 - x1) * (y - y1)) / (y2 - y1) + x1) inside = !inside
  }
  return inside
}

/** Distance of a position from a line, in the coordinates' unit. */
export function distanceFrom([x, y]: Vertex, line: readonly Vertex[]): number {
  let least = Number.POSITIVE_INFINITY
  for (let i = 1; i < line.length; i++) {
    const [x1, y1] = line[i - 1] as Vertex
    const [dx, dy] = [(line[i] as Vertex)[0] - x1, (line[i] as Vertex)[1] - y1]
    const square = dx * dx + dy * dy
    const along = square === 0 ? 0 : Math.max(0, Math.min(1, ((x - x1) * dx + (y - y1) * dy) / square))
    least = Math.min(least, Math.hypot(x1 + along * dx - x, y1 + along * dy - y))
  }
  return least
}

interface Surroundings {
  zones: readonly Row<Zone>[]
  boundaries: readonly Row<Boundary>[]
  units: ProjectUnits
}

/** Wells that stand where they would do nothing, or not what was meant. */
export function wellRemarks(
  wells: readonly Row<Well>[],
  { zones, boundaries, units }: Surroundings,
): Remarks {
  const remarks: Remarks = {}
  remarkRepeatedNames(remarks, wells)
  const polygons = zones.flatMap((zone) => (zone.body.polygon ? [zone.body.polygon] : []))
  const everywhere = zones.some((zone) => zone.body.polygon === null)
  for (const { id, body } of wells) {
    const at: Vertex = [body.x, body.y]
    if (zones.length > 0 && !everywhere && !polygons.some((ring) => liesInside(at, ring))) {
      addRemark(
        remarks,
        id,
        'x',
        'This well stands outside every zone of section 2: there is no ground to pump.',
      )
    }
    // Half a metre where no radius is given: nearer than any cell would be.
    const near = body.radius
      ? convert(body.radius, units.length)
      : convert({ value: 0.5, unit: 'm' }, units.length)
    const river = boundaries.find(
      (boundary) => boundary.body.kind === 'fixed head' && distanceFrom(at, boundary.body.line) <= near,
    )
    if (river) {
      addRemark(
        remarks,
        id,
        'x',
        `This well stands on the fixed head ${river.body.name}, which would supply all it pumps.`,
      )
    }
    if (body.rate.value === 0) addRemark(remarks, id, 'rate', 'This well does not run in the base case.')
  }
  return remarks
}

export function rechargeRemarks(zones: readonly Row<RechargeZone>[]): Remarks {
  const remarks: Remarks = {}
  remarkRepeatedNames(remarks, zones)
  // 10 mm/d over months is more than rain brings anywhere: common practice, no single source.
  for (const { id, body } of zones) {
    if (convert(body.rate, 'mm/d') > 10) {
      addRemark(
        remarks,
        id,
        'rate',
        'More than 10 mm/d: more than rain; is this a basin or a slip of the unit?',
      )
    }
  }
  return remarks
}

export function boundaryRemarks(boundaries: readonly Row<Boundary>[]): Remarks {
  const remarks: Remarks = {}
  remarkRepeatedNames(remarks, boundaries)
  for (const { id, body } of boundaries) {
    const levels = body.levels?.map((level) => convert(level, 'm')) ?? []
    if (levels.length > 1 && Math.max(...levels) - Math.min(...levels) > 50) {
      addRemark(
        remarks,
        id,
        'levels',
        'The levels along this line differ by more than 50 m: is one mistyped?',
      )
    }
  }
  return remarks
}

export function wallRemarks(walls: readonly Row<Wall>[]): Remarks {
  const remarks: Remarks = {}
  remarkRepeatedNames(remarks, walls)
  for (const { id, body } of walls) {
    if (convert(body.k, 'm/s') > 1e-6) {
      addRemark(remarks, id, 'k', 'Above 10⁻⁶ m/s: high for a cut-off wall.')
    }
  }
  return remarks
}

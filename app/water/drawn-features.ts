import type { Vertex } from '~/book/field'
import type { Row } from '~/book/row'
import type { DrawnFeature, DrawnGeometry } from '~/ground/drawing/drawn-feature'
import { convert, type Quantity } from '~/units'
import type { Boundary, RechargeZone, Wall, Well } from './water'

export function wellFeatures(wells: readonly Row<Well>[]): DrawnFeature[] {
  return wells.map(({ id, body }) => ({
    id,
    kind: 'well',
    label: body.kind === 'recharge' ? `${body.name} recharge` : body.name,
    geometry: { type: 'point', at: [body.x, body.y] },
    detail: { wellKind: body.kind },
  }))
}

/** Recharge zones that have a polygon; one without lies everywhere. */
export function rechargeZoneFeatures(zones: readonly Row<RechargeZone>[]): DrawnFeature[] {
  return zones.flatMap(({ id, body }): DrawnFeature[] =>
    body.polygon
      ? [
          {
            id,
            kind: 'recharge zone',
            label: body.name,
            geometry: { type: 'polygon', vertices: body.polygon },
          },
        ]
      : [],
  )
}

export function boundaryFeatures(boundaries: readonly Row<Boundary>[]): DrawnFeature[] {
  return boundaries.map(({ id, body }) => ({
    id,
    kind: 'boundary',
    label: `${body.name}, ${body.kind}`,
    geometry: { type: 'line', vertices: body.line },
    detail: { boundaryKind: body.kind },
  }))
}

export function wallFeatures(walls: readonly Row<Wall>[]): DrawnFeature[] {
  return walls.map(({ id, body }) => ({
    id,
    kind: 'wall',
    label: body.name,
    geometry: { type: 'line', vertices: body.line },
  }))
}

/**
 * A boundary along the line that was drawn. Levels given one a vertex follow: a vertex that stayed or was dragged keeps
 * its level, one that was put in gets the level of the old line at the nearest place, rounded to a thousandth.
 */
export function withBoundaryGeometry(body: Boundary, geometry: DrawnGeometry): Boundary {
  if (geometry.type !== 'line') return body
  const line = geometry.vertices
  const { levels } = body
  if (!levels || levels.length !== body.line.length || line.length === body.line.length) {
    return { ...body, line }
  }
  return { ...body, line, levels: line.map((vertex) => levelAt(vertex, body.line, levels)) }
}

function levelAt(at: Vertex, line: readonly Vertex[], levels: readonly Quantity[]): Quantity {
  let best = { distance: Number.POSITIVE_INFINITY, level: levels[0] as Quantity }
  for (let i = 1; i < line.length; i++) {
    const [a, b] = [line[i - 1] as Vertex, line[i] as Vertex]
    const [from, to] = [levels[i - 1] as Quantity, levels[i] as Quantity]
    const [dx, dy] = [b[0] - a[0], b[1] - a[1]]
    const square = dx * dx + dy * dy
    const along =
      square === 0 ? 0 : Math.max(0, Math.min(1, ((at[0] - a[0]) * dx + (at[1] - a[1]) * dy) / square))
    const distance = Math.hypot(a[0] + along * dx - at[0], a[1] + along * dy - at[1])
    if (distance >= best.distance) continue
    const between = from.value + along * (convert(to, from.unit) - from.value)
    const level =
      along === 0 ? from : along === 1 ? to : { value: Number(between.toFixed(3)), unit: from.unit }
    best = { distance, level }
  }
  return best.level
}

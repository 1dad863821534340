import type { Row } from '~/book/row'
import type { DrawnFeature, DrawnGeometry } from './drawing/drawn-feature'
import type { Material, Point, Zone } from './ground'

/** Zones that have a polygon; one without lies everywhere and has no outline to draw. */
export function zoneFeatures(
  zones: readonly Row<Zone>[],
  materials: readonly Row<Material>[] = [],
): DrawnFeature[] {
  return zones.flatMap(({ id, body }): DrawnFeature[] => {
    if (!body.polygon) return []
    const tint = Math.max(
      0,
      materials.findIndex((material) => material.id === body.materialId),
    )
    return [
      {
        id,
        kind: 'zone',
        label: body.name,
        geometry: { type: 'polygon', vertices: body.polygon },
        detail: { tint },
      },
    ]
  })
}

export function pointFeatures(points: readonly Row<Point>[]): DrawnFeature[] {
  return points.map(({ id, body }) => ({
    id,
    kind: 'point',
    label: body.name,
    geometry: { type: 'point', at: [body.x, body.y] },
  }))
}

/** A zone with the outline that was drawn; anything but a polygon leaves it as it was. */
export function withZoneGeometry<Body extends { polygon: Zone['polygon'] }>(
  body: Body,
  geometry: DrawnGeometry,
): Body {
  return geometry.type === 'polygon' ? { ...body, polygon: geometry.vertices } : body
}

/** A row at a position (a point, a well, an instrument) moved to where it was drawn. */
export function withPosition<Body extends { x: number; y: number }>(
  body: Body,
  geometry: DrawnGeometry,
): Body {
  return geometry.type === 'point' ? { ...body, x: geometry.at[0], y: geometry.at[1] } : body
}

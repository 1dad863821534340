import type { Row } from '~/book/row'
import type { DrawnFeature } from './drawing/drawn-feature'
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

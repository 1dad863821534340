import type * as File from '~/solver/model'
import { isInside } from '~/solver/polygon'
import type { PictureFeatures } from './picture'

/** What a run was computed from, for drawing over its heads: the frozen model file, not the book as it stands now. */
export function featuresOf(model: File.Model, noFlowEdges: readonly string[]): PictureFeatures {
  return {
    wells: (model.wells ?? []).map(({ name, x, y, kind }) => ({ name, x, y, kind })),
    rechargeZones: (model.recharge ?? []).map(({ name, polygon }) => ({ name, polygon: polygon ?? null })),
    boundaries: (model.boundaries ?? []).map(({ name, kind, line, polygon }) => ({
      name,
      kind,
      ...(line ? { line } : {}),
      ...(polygon ? { polygon } : {}),
    })),
    walls: (model.walls ?? []).map(({ name, line }) => ({ name, line })),
    points: (model.points ?? []).map(({ name, x, y }) => ({ name, x, y, kind: 'point' as const })),
    rings: (model.rings ?? []).map(({ name, polygon }) => ({ name, polygon })),
    noFlowEdges,
  }
}

export interface GroundLevels {
  base: number | null
  top: number | null
}

/**
 * Base and top level of the ground at a place, in the model's length: the last entry that covers it. Null where no
 * entry does, where a level is not given, and where it is a surface of scattered points.
 */
export function groundAt(model: File.Model, x: number, y: number): GroundLevels {
  const entry = model.ground.findLast(({ polygon }) => !polygon || isInside(polygon, x, y))
  const level = (value: number | File.Surface | undefined) => (typeof value === 'number' ? value : null)
  if (!entry) return { base: null, top: null }
  return entry.layers
    ? { base: level(entry.layers.at(-1)?.base), top: level(entry.layers[0]?.top) }
    : { base: level(entry.base), top: level(entry.top) }
}

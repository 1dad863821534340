import type { Model, Position } from '~/solver/model'
import { evenGround, type Formula, headOf, plainWells, potentialOf } from './formula'

/**
 * A well in the middle of a round island of even ground, its shore held at one head: Thiem (1906) where confined,
 * Dupuit (1863) and Thiem where not, with recharge on all of it where there is any.
 */
export function circleFormula(model: Model): Formula | null {
  if (model.time.kind !== 'steady' || (model.leakage ?? []).length > 0) return null
  const ground = evenGround(model)
  const wells = plainWells(model)
  const shape = model.ground[0]?.polygon
  const [shore, ...more] = model.boundaries ?? []
  if (!ground || !wells || !shape || more.length > 0) return null
  if (shore?.kind !== 'fixed head' || typeof shore.head !== 'number' || !shore.line) return null
  const recharge = (model.recharge ?? []).map(({ polygon, rate }) => (polygon ? Number.NaN : rate))
  if (recharge.some((rate) => typeof rate !== 'number' || Number.isNaN(rate))) return null
  const rate = (recharge as number[]).reduce((sum, one) => sum + one, 0)
  const [well, ...others] = wells
  const island = circleThrough(shape)
  if (!island || others.length > 0) return null
  const { x: cx, y: cy, radius } = island
  const near = 0.005 * radius
  if (!shore.line.every(([x, y]) => Math.abs(Math.hypot(x - cx, y - cy) - radius) < near)) return null
  const [first, last] = [shore.line[0] as Position, shore.line.at(-1) as Position]
  if (Math.hypot(first[0] - last[0], first[1] - last[1]) > near || shore.line.length < shape.length)
    return null
  if (well && Math.hypot(well.x - cx, well.y - cy) > 1e-6 * radius) return null
  const taken = well?.rates[0] ?? 0
  const level = potentialOf(ground, shore.head)
  return {
    name: `${well ? 'A well in a' : 'A'} round island, ${ground.confined ? 'confined' : 'unconfined'}`,
    source: ground.confined
      ? 'Thiem (1906), Hydrologische Methoden'
      : 'Dupuit (1863); Thiem (1906), Hydrologische Methoden',
    extentEffect: 0,
    headAt: (x, y) => {
      const r = Math.hypot(x - cx, y - cy)
      if (r > radius || (r === 0 && taken !== 0)) return null
      const cone = taken === 0 ? 0 : (taken / (2 * Math.PI)) * Math.log(radius / r)
      return headOf(ground, level + (rate * (radius * radius - r * r)) / 4 - cone)
    },
  }
}

/** The circle that a polygon of at least 24 corners draws, of the same area. */
function circleThrough(polygon: Position[]): { x: number; y: number; radius: number } | null {
  const [first, last] = [polygon[0] as Position, polygon.at(-1) as Position]
  const [second] = polygon.slice(1) as [Position]
  const side = Math.hypot(first[0] - second[0], first[1] - second[1])
  const closed = Math.hypot(first[0] - last[0], first[1] - last[1]) < 1e-6 * side
  const corners = closed ? polygon.slice(0, -1) : polygon
  if (corners.length < 24) return null
  const x = corners.reduce((sum, corner) => sum + corner[0], 0) / corners.length
  const y = corners.reduce((sum, corner) => sum + corner[1], 0) / corners.length
  const radii = corners.map((corner) => Math.hypot(corner[0] - x, corner[1] - y))
  const radius = radii.reduce((sum, r) => sum + r, 0) / radii.length
  return radii.every((r) => Math.abs(r - radius) < 0.002 * radius) ? { x, y, radius } : null
}

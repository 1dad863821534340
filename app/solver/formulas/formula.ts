import type { Model, Position } from '~/solver/model'

/** A solution in closed form that holds for a whole model. */
export interface Formula {
  name: string
  source: string
  /** Head at a place and, in transient flow, at a time from time zero; null where the formula does not reach. */
  headAt: (x: number, y: number, time: number) => number | null
  /** The most that the finite extent of the model may change a head by, as the formula itself tells; 0: nothing. */
  extentEffect: number
}

/** Ground that is one and the same everywhere. */
export interface EvenGround {
  k: number
  base: number
  /** Infinite where unconfined ground has no top. */
  top: number
  confined: boolean
  specificStorage: number | undefined
}

/** The ground of a plan model where one layer of one isotropic material fills the extent; null otherwise. */
export function evenGround(model: Model): EvenGround | null {
  if (model.kind !== 'plan' || (model.walls ?? []).length > 0) return null
  const [entry, ...more] = model.ground
  if (!entry || more.length > 0) return null
  const layers = entry.layers ?? [entry]
  const layer = layers[0]
  if (!layer || layers.length > 1 || typeof layer.base !== 'number') return null
  if (layer.top !== undefined && typeof layer.top !== 'number') return null
  const material = model.materials.find(({ name }) => name === layer.material)
  if (!material || material.kx !== material.ky) return null
  const confined = model.flow === 'confined'
  return {
    k: material.kx,
    base: layer.base,
    top: layer.top ?? Number.POSITIVE_INFINITY,
    confined,
    specificStorage: material.specificStorage,
  }
}

/** Does that ground reach everywhere in the extent? */
export function fillsExtent(model: Model): boolean {
  return model.ground.every((entry) => entry.polygon === undefined)
}

/** Discharge potential: T h where confined, K (h - base)^2 / 2 where not (Girinskii 1946). */
export function potentialOf(ground: EvenGround, head: number): number {
  if (ground.confined) return ground.k * (ground.top - ground.base) * head
  return (ground.k * (head - ground.base) ** 2) / 2
}

/** The head of a discharge potential; null where the ground would be dry, or the water above its top. */
export function headOf(ground: EvenGround, potential: number): number | null {
  if (ground.confined) return potential / (ground.k * (ground.top - ground.base))
  if (potential <= 0) return null
  const head = ground.base + Math.sqrt((2 * potential) / ground.k)
  return head <= ground.top ? head : null
}

export interface PlainWell {
  x: number
  y: number
  radius: number
  /** Water taken out, by stage; negative for recharge. */
  rates: number[]
}

/** The wells with plain rates; null where one has a lowest level, which may reduce it. */
export function plainWells(model: Model): PlainWell[] | null {
  const wells: PlainWell[] = []
  for (const well of model.wells ?? []) {
    if (well.lowestLevel !== undefined) return null
    if (typeof well.rate === 'object' && !Array.isArray(well.rate)) return null
    const sign = well.kind === 'abstraction' ? 1 : -1
    const rates = [well.rate].flat().map((rate) => sign * rate)
    wells.push({ x: well.x, y: well.y, radius: well.radius ?? 0, rates })
  }
  return wells
}

export type Side = 'west' | 'east' | 'south' | 'north'

/** The head that each side of the extent is held at over its whole length, or null for no flow. */
export type Sides = Record<Side, number | null>

/** Null where a boundary is anything else than a fixed head, the same over one or more whole sides. */
export function sidesOf(model: Model): Sides | null {
  const { x, y } = model.extent
  const covered: Record<Side, { length: number; head: number }> = {
    west: { length: 0, head: Number.NaN },
    east: { length: 0, head: Number.NaN },
    south: { length: 0, head: Number.NaN },
    north: { length: 0, head: Number.NaN },
  }
  const near = 1e-9 * Math.max(x[1] - x[0], y[1] - y[0])
  function sideOf(a: Position, b: Position): Side | null {
    const on = (axis: 0 | 1, value: number) =>
      Math.abs(a[axis] - value) <= near && Math.abs(b[axis] - value) <= near
    if (on(0, x[0])) return 'west'
    if (on(0, x[1])) return 'east'
    if (on(1, y[0])) return 'south'
    return on(1, y[1]) ? 'north' : null
  }
  for (const boundary of model.boundaries ?? []) {
    if (boundary.kind !== 'fixed head' || !boundary.line) return null
    if (typeof boundary.head === 'object' && !Array.isArray(boundary.head)) return null
    const heads = [boundary.head].flat()
    const head = heads[0] as number
    if (heads.some((other) => other !== head)) return null
    for (let s = 0; s + 1 < boundary.line.length; s++) {
      const [a, b] = [boundary.line[s] as Position, boundary.line[s + 1] as Position]
      const side = sideOf(a, b)
      if (!side) return null
      const entry = covered[side]
      if (entry.length > 0 && entry.head !== head) return null
      entry.length += Math.hypot(b[0] - a[0], b[1] - a[1])
      entry.head = head
    }
  }
  const sides: Sides = { west: null, east: null, south: null, north: null }
  for (const side of ['west', 'east', 'south', 'north'] as const) {
    const whole = side === 'west' || side === 'east' ? y[1] - y[0] : x[1] - x[0]
    const { length, head } = covered[side]
    if (length === 0) continue
    if (Math.abs(length - whole) > 4 * near) return null
    sides[side] = head
  }
  return sides
}

/** Mean of the heads round a well's face, which is the head in it: in four directions, so that no gradient counts. */
export function meanRound(
  x: number,
  y: number,
  radius: number,
  headAt: (x: number, y: number) => number,
): number {
  return (headAt(x + radius, y) + headAt(x - radius, y) + headAt(x, y + radius) + headAt(x, y - radius)) / 4
}

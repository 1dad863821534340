import type { FlowModel, ProfileFlow } from './flow'
import { type Profile, transmissivityAt } from './ground'
import { obliqueLogRadii, type PlaneTensor } from './oblique-wells'
import { levelOfPotential, potentialAt, slopeAt } from './saturated'
import { logEquivalentRadius, type PlacedWell } from './wells'

/** Geometric mean of the principal transmissivities at a cell; what a well in it meets. */
export function wellTransmissivity(flow: FlowModel, cell: number, h: number): number {
  const profile = flow.d.profileOf[cell] as number
  const { xx, xy, yy } = tensorAt(flow, profile, h)
  return Math.sqrt(xx * yy - xy * xy)
}

/** The conductivities' geometric mean a layer, as a discharge potential: unconfined flow to a well. */
function wellPotential(flow: FlowModel, cell: number) {
  const { x, y } = flow.flows[flow.d.profileOf[cell] as number] as ProfileFlow
  return {
    profile: x.profile,
    film: x.film,
    k: x.k.map((kx, layer) => {
      return Math.sqrt(kx * (y.k[layer] as number) - (x.profile.kxy[layer] as number) ** 2)
    }),
  }
}

/** ln(equivalent radius / well radius), or 0 without a radius. */
export function logRadii(flow: FlowModel, well: PlacedWell, heads: Float64Array): number {
  if (well.radius === 0) return 0
  const { grid } = flow.d
  const places = well.shares.map(({ cell, weight }) => {
    const row = Math.floor(cell / grid.columns)
    return { column: cell - row * grid.columns, row, weight }
  })
  function spacing(edges: Float64Array, indices: number[]): number {
    const low = Math.min(...indices)
    const high = Math.max(...indices)
    if (low === high) return (edges[low + 1] as number) - (edges[low] as number)
    return ((edges[high + 1] as number) - (edges[low] as number)) / 2
  }
  const dx = spacing(
    grid.xEdges,
    places.map((place) => place.column),
  )
  const dy = spacing(
    grid.yEdges,
    places.map((place) => place.row),
  )
  const main = mainCell(well)
  const profile = flow.d.profileOf[main] as number
  const potentials = flow.flows[profile]
  const anisotropy = potentials
    ? slopeAt(potentials.x, heads[main] as number) / slopeAt(potentials.y, heads[main] as number)
    : (flow.fullX[profile] as number) / (flow.fullY[profile] as number)
  const { kxy } = flow.d.profiles[profile] as Profile
  if (kxy.some((cross) => cross !== 0)) {
    return obliqueLogRadii(places, dx, dy, tensorAt(flow, profile, heads[main] as number), well.radius)
  }
  return logEquivalentRadius(places, dx, dy, anisotropy) - Math.log(well.radius)
}

function tensorAt(flow: FlowModel, profile: number, h: number): PlaneTensor {
  const ground = flow.d.profiles[profile] as Profile
  const potentials = flow.flows[profile]
  if (!potentials) {
    const xy = transmissivityAt(ground, ground.kxy, Number.POSITIVE_INFINITY)
    return { xx: flow.fullX[profile] as number, xy, yy: flow.fullY[profile] as number }
  }
  const { x, y } = potentials
  return { xx: slopeAt(x, h), xy: slopeAt({ ...x, k: ground.kxy }, h), yy: slopeAt(y, h) }
}

export function mainCell(well: PlacedWell): number {
  let main = well.shares[0] as PlacedWell['shares'][number]
  for (const share of well.shares) if (share.weight > main.weight) main = share
  return main.cell
}

/** The weighted mean of the heads of the cells that share the well. */
export function cellHeadOf(well: PlacedWell, heads: Float64Array): number {
  return well.shares.reduce((sum, { cell, weight }) => sum + weight * (heads[cell] as number), 0)
}

/** Head at the well face by the equivalent radius (Peaceman 1978, 1983); null without a radius or when dry. */
export function wellHeadOf(
  flow: FlowModel,
  well: PlacedWell,
  rate: number,
  heads: Float64Array,
): number | null {
  if (well.radius === 0) return null
  const loss = (rate * logRadii(flow, well, heads)) / (2 * Math.PI)
  const main = mainCell(well)
  if (!flow.d.unconfined) return cellHeadOf(well, heads) + loss / wellTransmissivity(flow, main, 0)
  const potential = wellPotential(flow, main)
  const value = well.shares.reduce(
    (sum, { cell, weight }) => sum + weight * potentialAt(potential, heads[cell] as number),
    loss,
  )
  const level = levelOfPotential(potential, value)
  return level > (potential.profile.base[0] as number) + 2 * flow.film ? level : null
}

/** The lowest level a well may have: its own, and 1 % of the thickness above the base in unconfined ground. */
export function lowestLevelOf(flow: FlowModel, well: PlacedWell): number {
  if (!flow.d.unconfined) return well.lowestLevel
  return Math.max(well.lowestLevel, yieldLevel(flow, mainCell(well)))
}

/** Below this a cell of unconfined ground yields nothing to a well: 1 % of its thickness at the highest known level. */
function yieldLevel(flow: FlowModel, cell: number): number {
  const { base } = flow.flows[flow.d.profileOf[cell] as number] as ProfileFlow
  return base + 0.01 * Math.max(flow.d.highestHead - base, 0)
}

/**
 * How far, in discharge potential, a well stands above its lowest level: nearly linear in its rate. In unconfined
 * ground none of the cells that share it may fall dry either; `cell` is the one that decides then, else -1.
 */
export function clearance(
  flow: FlowModel,
  well: PlacedWell,
  rate: number,
  heads: Float64Array,
): { above: number; cell: number } {
  const loss = (rate * logRadii(flow, well, heads)) / (2 * Math.PI)
  const limit = lowestLevelOf(flow, well)
  const main = mainCell(well)
  if (!flow.d.unconfined) {
    return { above: wellTransmissivity(flow, main, 0) * (cellHeadOf(well, heads) - limit) + loss, cell: -1 }
  }
  const potential = wellPotential(flow, main)
  let decides = {
    above: well.shares.reduce(
      (sum, share) => sum + share.weight * potentialAt(potential, heads[share.cell] as number),
      loss - potentialAt(potential, limit),
    ),
    cell: -1,
  }
  for (const { cell } of well.shares) {
    const own = wellPotential(flow, cell)
    const above = potentialAt(own, heads[cell] as number) - potentialAt(own, yieldLevel(flow, cell))
    if (above < decides.above) decides = { above, cell }
  }
  return decides
}

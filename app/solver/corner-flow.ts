import { type Corners, highOf, lowOf, packed } from './corners'
import { columnFaceCount } from './faces'
import type { FlowModel, FlowState, Matrix, ProfileFlow } from './flow'
import { potentialAt, slopeAt } from './saturated'

/** Drops across the half faces of one corner, and how the lower and the higher cell's head change them. */
interface Drops {
  drop: Float64Array
  byLow: Float64Array
  byHigh: Float64Array
}

const scratch: Drops = {
  drop: new Float64Array(4),
  byLow: new Float64Array(4),
  byHigh: new Float64Array(4),
}
const flows = new Float64Array(4)

/** Drop of head (confined) or of the thickness' potential (unconfined) across half face k, 0 where nothing passes. */
function dropAt(model: FlowModel, corners: Corners, heads: Float64Array, entry: number, k: number): void {
  const low = corners.cells[4 * entry + (lowOf[k] as number)] as number
  const high = corners.cells[4 * entry + (highOf[k] as number)] as number
  const outside = corners.outside[4 * entry + k] as number
  const { drop, byLow, byHigh } = scratch
  if ((low < 0 || high < 0) && Number.isNaN(outside)) {
    drop[k] = 0
    byLow[k] = 0
    byHigh[k] = 0
    return
  }
  const ha = low < 0 ? outside : (heads[low] as number)
  const hb = high < 0 ? outside : (heads[high] as number)
  if (!model.d.unconfined) {
    drop[k] = ha - hb
    byLow[k] = 1
    byHigh[k] = 1
    return
  }
  const { profileOf } = model.d
  const pa = profileOf[low < 0 ? high : low] as number
  const pb = profileOf[high < 0 ? low : high] as number
  const a = model.flows[pa] as ProfileFlow
  const b = model.flows[pb] as ProfileFlow
  const sa = slopeAt(a.thickness, ha)
  const sb = slopeAt(b.thickness, hb)
  if (pa === pb) {
    drop[k] = potentialAt(a.thickness, ha) - potentialAt(b.thickness, hb)
    byLow[k] = sa
    byHigh[k] = sb
    return
  }
  drop[k] = 0.5 * (sa + sb) * (ha - hb)
  byLow[k] = 0.5 * (sa + sb) + (isRising(a, ha, model.film) ? 0.5 * (ha - hb) : 0)
  byHigh[k] = 0.5 * (sa + sb) - (isRising(b, hb, model.film) ? 0.5 * (ha - hb) : 0)
}

/** Does the saturated thickness change with the head? */
function isRising({ thickness: { profile } }: ProfileFlow, h: number, film: number): boolean {
  const top = profile.top[profile.top.length - 1] as number
  return h > (profile.base[0] as number) + film && h < top
}

/** Excess flows through the half faces of an entry, positive from low to high, into `flows`. */
function flowsAt(model: FlowModel, corners: Corners, heads: Float64Array, entry: number): void {
  for (let k = 0; k < 4; k++) dropAt(model, corners, heads, entry, k)
  const { excess, imposed } = corners
  for (let k = 0; k < 4; k++) {
    let flow = imposed[4 * entry + k] as number
    for (let l = 0; l < 4; l++) {
      flow += (excess[10 * entry + packed[k as 0][l as 0]] as number) * (scratch.drop[l] as number)
    }
    flows[k] = flow
  }
}

/** Adds what oblique directions carry to the cells' balance and, in place, to the matrix of the next Newton step. */
export function addCornerFlows(
  model: FlowModel,
  corners: Corners,
  heads: Float64Array,
  { imbalance, forcing }: FlowState,
  matrix: Matrix | null,
): void {
  const { fixedBy } = model.d
  const { cells, excess } = corners
  for (let entry = 0; entry < corners.count; entry++) {
    flowsAt(model, corners, heads, entry)
    for (let k = 0; k < 4; k++) {
      const low = cells[4 * entry + (lowOf[k] as number)] as number
      const high = cells[4 * entry + (highOf[k] as number)] as number
      const q = flows[k] as number
      if (low >= 0) {
        imbalance[low] = (imbalance[low] as number) - q
        if (high < 0 || (fixedBy[high] as number) >= 0) forcing[low] = (forcing[low] as number) + Math.abs(q)
      }
      if (high >= 0) {
        imbalance[high] = (imbalance[high] as number) + q
        if (low < 0 || (fixedBy[low] as number) >= 0) forcing[high] = (forcing[high] as number) + Math.abs(q)
      }
    }
    if (!matrix) continue
    local.fill(0)
    for (let k = 0; k < 4; k++) {
      for (let l = 0; l < 4; l++) {
        const m = excess[10 * entry + packed[k as 0][l as 0]] as number
        if (m === 0) continue
        const byLow = m * (scratch.byLow[l] as number)
        const byHigh = m * (scratch.byHigh[l] as number)
        // What leaves through half face k leaves its low cell and enters its high one.
        addLocal(lowOf[k] as number, lowOf[l] as number, byLow)
        addLocal(lowOf[k] as number, highOf[l] as number, -byHigh)
        addLocal(highOf[k] as number, lowOf[l] as number, -byLow)
        addLocal(highOf[k] as number, highOf[l] as number, byHigh)
      }
    }
    addRows(matrix, cells, entry, fixedBy)
  }
}

/** How the outflow of the cell at place p of the corner grows with the head of the cell at place q. */
const local = new Float64Array(16)

function addLocal(p: number, q: number, by: number): void {
  local[4 * p + q] = (local[4 * p + q] as number) + by
}

function addRows(matrix: Matrix, cells: Int32Array, entry: number, fixedBy: Int32Array): void {
  const { diag, own, weight, symmetric } = matrix
  for (let p = 0; p < 4; p++) {
    const cell = cells[4 * entry + p] as number
    if (cell < 0 || (fixedBy[cell] as number) >= 0) continue
    diag[cell] = (diag[cell] as number) + (local[5 * p] as number)
    let tie = local[5 * p] as number
    for (let q = 0; q < 4; q++) {
      const other = cells[4 * entry + q] as number
      if (q === p || other < 0 || (fixedBy[other] as number) >= 0) continue
      const by = (local[4 * p + q] as number) / (weight[other] as number)
      tie += by * (weight[cell] as number)
      // Where the matrix is symmetric, opposite links are the same memory.
      if (symmetric && q < p) continue
      const link = linkOf(matrix, p, q)
      link[cell] = (link[cell] as number) - by
    }
    own[cell] = (own[cell] as number) + tie
  }
}

/** The matrix' links from the cell at place p of a corner (south-west, south-east, north-west, north-east) to q. */
function linkOf(matrix: Matrix, p: number, q: number): Float64Array {
  const column = (q & 1) - (p & 1)
  const row = (q >> 1) - (p >> 1)
  if (row === 0) return column > 0 ? matrix.east : matrix.west
  if (column === 0) return row > 0 ? matrix.north : matrix.south
  const corners = matrix.corners as NonNullable<Matrix['corners']>
  if (row > 0) return column > 0 ? corners.northEast : corners.northWest
  return column > 0 ? corners.southEast : corners.southWest
}

/**
 * What oblique directions add to the flow through a face between two cells or on the model's edge, positive from low
 * to high: the half faces at both of its ends. Added to the five-point flow it is the whole flow, and every ring
 * balances.
 */
export function cornerFlowAtFace(
  model: FlowModel,
  corners: Corners,
  heads: Float64Array,
  face: number,
): number {
  const { columns } = model.d.grid
  const split = columnFaceCount(model.d.grid)
  const byColumns = face < split
  const width = byColumns ? columns + 1 : columns
  const j = Math.floor((byColumns ? face : face - split) / width)
  const i = (byColumns ? face : face - split) - j * width
  const first = corners.entryOf[j * (columns + 1) + i] as number
  const second = corners.entryOf[
    byColumns ? (j + 1) * (columns + 1) + i : j * (columns + 1) + i + 1
  ] as number
  let flow = 0
  if (first >= 0) {
    flowsAt(model, corners, heads, first)
    flow += flows[byColumns ? 1 : 3] as number
  }
  if (second >= 0) {
    flowsAt(model, corners, heads, second)
    flow += flows[byColumns ? 0 : 2] as number
  }
  return flow
}

/** What oblique directions add to the flow of each exchange into its cell, by exchange. */
export function cornerFlowOfExchanges(model: FlowModel, corners: Corners, heads: Float64Array): Float64Array {
  const inflow = new Float64Array(model.d.exchanges.length)
  for (const [place, list] of corners.exchangesAt) {
    const entry = place >> 2
    const k = place & 3
    flowsAt(model, corners, heads, entry)
    const isHigh = (corners.cells[4 * entry + (highOf[k] as number)] as number) >= 0
    for (const { exchange, share } of list) {
      inflow[exchange] = (inflow[exchange] as number) + (isHigh ? 1 : -1) * share * (flows[k] as number)
    }
  }
  return inflow
}

import { cornerFlowOfExchanges } from './corner-flow'
import type { Discretised } from './discretise'
import {
  evaluate,
  exchangeFlow,
  type FaceFlow,
  type FlowModel,
  type FlowState,
  flowAtFace,
  type StorageTerm,
  storedVolumes,
} from './flow'

/** Flow in and out, both counted positive: volume/time. */
export interface Tally {
  inflow: number
  outflow: number
}

/** Adds a flow, positive in, to a tally. */
export function addTo(tally: Tally, q: number): void {
  if (q > 0) tally.inflow += q
  else tally.outflow -= q
}

/** Every flow of one state of the ground, whatever computed it. Flows by cell are into the cell; volume/time. */
export interface FlowField {
  d: Discretised
  /** Through the face between two active cells, positive from its low to its high cell; 0 elsewhere. */
  atFace: (face: number) => number
  /** Into the ground through outer faces, by face. */
  atOuterFaces: Map<number, number>
  wells: Float64Array
  recharge: Float64Array
  leakage: Float64Array
  boundaries: Float64Array
  /** Into storage. */
  storage: Float64Array
  /** What does not balance. */
  error: Float64Array
  byBoundary: Tally[]
  byLeakage: Tally[]
  byRecharge: number[]
  /** Of each well, into the ground. */
  byWell: number[]
}

/** An empty field of a model, its recharge in place. */
export function emptyField(d: Discretised, atFace: (face: number) => number): FlowField {
  const count = d.active.length
  return {
    d,
    atFace,
    atOuterFaces: new Map(),
    wells: new Float64Array(count),
    recharge: d.recharge,
    leakage: new Float64Array(count),
    boundaries: new Float64Array(count),
    storage: new Float64Array(count),
    error: new Float64Array(count),
    byBoundary: (d.model.boundaries ?? []).map(() => ({ inflow: 0, outflow: 0 })),
    byLeakage: (d.model.leakage ?? []).map(() => ({ inflow: 0, outflow: 0 })),
    byRecharge: d.rechargeByEntry,
    byWell: [],
  }
}

/**
 * Every flow of plan flow and saturated sections at the given heads. Cells held at a head take from their boundary
 * what their neighbours, and their storage, ask.
 */
export function planField(
  flow: FlowModel,
  heads: Float64Array,
  rates: number[],
  storage: StorageTerm | null,
): FlowField {
  const { d } = flow
  const count = d.active.length
  const field = emptyField(d, (face) => flowAtFace(flow, heads, face))
  const state: FlowState = { imbalance: new Float64Array(count), forcing: new Float64Array(count) }
  evaluate(flow, heads, rates, state, null, storage)
  if (storage) {
    const stored = storedVolumes(flow, heads)
    for (let cell = 0; cell < count; cell++) {
      field.storage[cell] = ((stored[cell] as number) - (storage.before[cell] as number)) / storage.interval
    }
  }
  const out: FaceFlow = { q: 0, byLow: 0, byHigh: 0 }
  const oblique = d.corners ? cornerFlowOfExchanges(flow, d.corners, heads) : null
  for (const [index, exchange] of d.exchanges.entries()) {
    exchangeFlow(flow, exchange, heads[exchange.cell] as number, out)
    if (oblique) out.q += oblique[index] as number
    const tallies = exchange.owner === 'boundaries' ? field.byBoundary : field.byLeakage
    addTo(tallies[exchange.index] as Tally, out.q)
    into(field[exchange.owner], exchange.cell, out.q)
    throughOuter(field, exchange.face, out.q)
  }
  for (const { index, cell, face, rate } of d.specifiedFlows) {
    addTo(field.byBoundary[index] as Tally, rate)
    into(field.boundaries, cell, rate)
    throughOuter(field, face, rate)
  }
  for (let cell = 0; cell < count; cell++) {
    if (d.active[cell] !== 1) continue
    const by = d.fixedBy[cell] as number
    if (by < 0) {
      field.error[cell] = state.imbalance[cell] as number
      continue
    }
    const q = -(state.imbalance[cell] as number)
    addTo(field.byBoundary[by] as Tally, q)
    into(field.boundaries, cell, q)
  }
  placeWellFlows(field, rates)
  return field
}

function into(list: Float64Array, cell: number, q: number): void {
  list[cell] = (list[cell] as number) + q
}

/** Adds a flow into the ground through an outer face; -1 is none. */
export function throughOuter(field: FlowField, face: number, q: number): void {
  if (face >= 0) field.atOuterFaces.set(face, (field.atOuterFaces.get(face) ?? 0) + q)
}

/** Puts the wells' flows into the field, shared among their cells. */
export function placeWellFlows(field: FlowField, rates: number[]): void {
  field.d.wells.forEach((well, index) => {
    field.byWell.push(rates[index] as number)
    for (const { cell, weight } of well.shares) into(field.wells, cell, weight * (rates[index] as number))
  })
}

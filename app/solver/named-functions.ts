import type { Outcome } from './balancer'
import type { Discretised } from './discretise'
import { faceOf, facesOfCell } from './faces'
import { exchangeFlow, type FaceFlow, flowAtFace } from './flow'
import { emptyField, planField } from './flow-field'
import { cellAt } from './grid'
import { crossedFaces, placeLine } from './line-on-grid'
import type { Position } from './model'
import { headAt, placeOfPoint, pointResults } from './points'
import { checkedPolygon, visitCellsInside } from './polygon'
import { lineDischarges, ringFlows } from './rings'
import { cellHeadOf, wellHeadOf } from './well-heads'
import type { PlacedWell } from './wells'

/** The ground at hand: what named results are functions of. */
export type State = Pick<Outcome, 'flow' | 'heads' | 'rates'>

/** Every named result of a steady state, in the model's datum; null where there is none. */
export function namedAt({ flow, heads, rates }: State): Map<string, number | null> {
  const { d } = flow
  const { model, reference } = d
  const field = planField(flow, heads, rates, null)
  const named = new Map<string, number | null>()
  for (const { name, head } of pointResults(flow, heads, field.atOuterFaces, reference)) {
    named.set(`points/${name}`, head[0] ?? null)
  }
  d.wells.forEach((well, index) => {
    const level = wellHeadOf(flow, well, rates[index] as number, heads) ?? cellHeadOf(well, heads)
    named.set(`wells/${well.name}`, level + reference)
  })
  const discharges = lineDischarges(field)
  model.lines?.forEach(({ name }, index) => {
    named.set(`lines/${name}`, discharges[index] as number)
  })
  const rings = ringFlows(field)
  model.rings?.forEach(({ name }, index) => {
    named.set(`rings/${name}/through`, rings[index]?.through as number)
  })
  return named
}

/** Names of the results that have derivatives, in the order of the result. */
export function namesOf({ model, wells }: State['flow']['d']): string[] {
  return [
    ...(model.points ?? []).map(({ name }) => `points/${name}`),
    ...wells.map(({ name }) => `wells/${name}`),
    ...(model.lines ?? []).map(({ name }) => `lines/${name}`),
    ...(model.rings ?? []).map(({ name }) => `rings/${name}/through`),
  ]
}

/** Derivatives of a named result by the head of every cell, everything else held. Null: no such result here. */
export function slopesOf(state: State, name: string): Float64Array | null {
  const { model, wells } = state.flow.d
  const [kind, ...rest] = name.split('/')
  const own = rest.join('/')
  if (kind === 'points') {
    const index = (model.points ?? []).findIndex((point) => point.name === own)
    return index < 0 ? null : pointSlopes(state, index)
  }
  if (kind === 'wells') {
    const index = wells.findIndex((well) => well.name === own)
    return index < 0 ? null : wellSlopes(state, index)
  }
  if (kind === 'lines') {
    const line = (model.lines ?? []).find((entry) => entry.name === own)
    return line ? lineSlopes(state, name, line.line) : null
  }
  const ring = (model.rings ?? []).find((entry) => `${entry.name}/through` === own)
  return kind === 'rings' && ring ? countedSlopes(state, name) : null
}

/** Central differences by the heads of some cells: exact where the function is linear or quadratic. */
function byDifferences(
  state: State,
  cells: Iterable<number>,
  value: () => number,
  into: Float64Array,
  factor = 1,
): void {
  const { heads, flow } = state
  const step = 1e-5 * Math.max(flow.d.headRange, 1e-3)
  for (const cell of new Set(cells)) {
    if (flow.d.active[cell] !== 1) continue
    const own = heads[cell] as number
    heads[cell] = own + step
    const above = value()
    heads[cell] = own - step
    const below = value()
    heads[cell] = own
    into[cell] = (into[cell] as number) + (factor * (above - below)) / (2 * step)
  }
}

/** The cells of a block of (2 reach + 1) squared round one. */
function blockAround({ flow }: State, cell: number, reach: number): number[] {
  const { columns, rows } = flow.d.grid
  const j = Math.floor(cell / columns)
  const i = cell - j * columns
  const cells: number[] = []
  for (let row = Math.max(0, j - reach); row <= Math.min(rows - 1, j + reach); row++) {
    for (let column = Math.max(0, i - reach); column <= Math.min(columns - 1, i + reach); column++) {
      cells.push(row * columns + column)
    }
  }
  return cells
}

function pointSlopes(state: State, index: number): Float64Array | null {
  const { flow, heads } = state
  const { d } = flow
  const point = (d.model.points ?? [])[index]
  if (!point) return null
  const [x, y] = placeOfPoint(d, point, `points[${index}]`)
  const cells = blockAround(state, cellAt(d.grid, x, y), d.corners ? 3 : 1)
  const faces = new Set(cells.flatMap((cell) => facesOfCell(d.grid, cell)))
  const outer = outerFlowsAt(state, faces)
  const slopes = new Float64Array(heads.length)
  if (typeof headAt(flow, heads, outer(), x, y) !== 'number') return null
  byDifferences(state, cells, () => headAt(flow, heads, outer(), x, y) as number, slopes)
  return slopes
}

/** Flow into the ground through the given outer faces, computed anew at each call. */
function outerFlowsAt({ flow, heads, rates }: State, faces: Set<number>): () => Map<number, number> {
  const { d } = flow
  if (d.corners) return () => planField(flow, heads, rates, null).atOuterFaces
  const exchanges = d.exchanges.filter(({ face }) => faces.has(face))
  const given = d.specifiedFlows.filter(({ face }) => faces.has(face))
  const out: FaceFlow = { q: 0, byLow: 0, byHigh: 0 }
  return () => {
    const flows = new Map<number, number>()
    for (const exchange of exchanges) {
      exchangeFlow(flow, exchange, heads[exchange.cell] as number, out)
      flows.set(exchange.face, (flows.get(exchange.face) ?? 0) + out.q)
    }
    for (const { face, rate } of given) flows.set(face, (flows.get(face) ?? 0) + rate)
    return flows
  }
}

function wellSlopes(state: State, index: number): Float64Array {
  const { flow, heads, rates } = state
  const well = flow.d.wells[index] as PlacedWell
  const slopes = new Float64Array(heads.length)
  const cells = well.shares.map(({ cell }) => cell)
  const rate = rates[index] as number
  byDifferences(state, cells, () => wellHeadOf(flow, well, rate, heads) ?? cellHeadOf(well, heads), slopes)
  return slopes
}

function addFace(state: State, face: number, factor: number, into: Float64Array): void {
  const { flow, heads } = state
  const { d } = flow
  const { low, high } = faceOf(d.grid, face)
  const cells = d.corners
    ? [low, high].flatMap((cell) => (cell < 0 ? [] : blockAround(state, cell, 1)))
    : [low, high]
  byDifferences(
    state,
    cells.filter((cell) => cell >= 0),
    () => flowAtFace(flow, heads, face),
    into,
    factor,
  )
}

/**
 * The faces between cells whose flow a line's discharge or a ring's flow through counts, and how often with its sign;
 * empty for other results.
 */
export function countedFaces(d: Discretised, name: string): Map<number, number> {
  const counted = new Map<number, number>()
  const count = (face: number, by: number) => counted.set(face, (counted.get(face) ?? 0) + by)
  const line = (d.model.lines ?? []).find((entry) => `lines/${entry.name}` === name)
  if (line) {
    for (const { face, share, left } of crossedFaces(d.grid, line.line, [true, true]))
      count(face, left * share)
  }
  const ring = (d.model.rings ?? []).find((entry) => `rings/${entry.name}/through` === name)
  if (!ring) return counted
  const { columns } = d.grid
  const inside = new Uint8Array(d.active.length)
  visitCellsInside(d.grid, checkedPolygon(ring.polygon, 'rings'), (cell) => {
    inside[cell] = d.active[cell] as number
  })
  for (let cell = 0; cell < inside.length; cell++) {
    const [west, , south] = facesOfCell(d.grid, cell)
    const into = inside[cell] === 1 ? 1 : -1
    if (cell % columns > 0 && inside[cell] !== inside[cell - 1]) count(west, into)
    if (cell >= columns && inside[cell] !== inside[cell - columns]) count(south, into)
  }
  return counted
}

function countedSlopes(state: State, name: string): Float64Array {
  const slopes = new Float64Array(state.heads.length)
  for (const [face, factor] of countedFaces(state.flow.d, name)) addFace(state, face, factor, slopes)
  return slopes
}

/** A line along the edge of the ground counts what crosses the outer faces too. */
function lineSlopes(state: State, name: string, line: Position[]): Float64Array {
  const { d } = state.flow
  const slopes = countedSlopes(state, name)
  const outer = placeLine(d.grid, d.active, line).faces
  if (outer.length === 0) return slopes
  const cells = outer.flatMap(({ cell }) => blockAround(state, cell, d.corners ? 2 : 0))
  const flows = outerFlowsAt(state, new Set(outer.map(({ face }) => face)))
  const alone = { ...d, model: { ...d.model, lines: [{ name, line }] } }
  const discharge = () =>
    lineDischarges({ ...emptyField(alone, () => 0), atOuterFaces: flows() })[0] as number
  byDifferences(state, cells, discharge, slopes)
  return slopes
}

import type { Outcome } from './balancer'
import type { Discretised } from './discretise'
import { columnFaceCount, faceCount, faceOf } from './faces'
import { exchangeFlow, type FaceFlow, type FlowModel } from './flow'
import type { FlowField } from './flow-field'
import { cellAt, type Grid } from './grid'
import { type Profile, thicknessAt } from './ground'
import type { FlowLineWish, Model, Position } from './model'
import { ModelError, requireFinite } from './model-error'
import { isInside } from './polygon'
import type { FlowLineEnd, FlowLineResult } from './result'
import type { PlacedWell } from './wells'

/**
 * The velocity field of one moment, ready for tracking. In transient flow it is that of the moment as if it stood
 * still. Flows are volume/time, times in the model's unit.
 */
export interface Velocities {
  flow: FlowModel
  grid: Grid
  /** By face, positive towards high x or y, outer faces included. */
  through: Float64Array
  /** Water that fills a cell's pores, for each unit of its area: porosity x saturated thickness. 0: dry or no ground. */
  pore: Float64Array
  heads: Float64Array
  rates: ArrayLike<number>
  /** What acts through outer faces: indices of exchanges and of specified flows, by face. */
  exchangesAt: Map<number, number[]>
  flowsAt: Map<number, number[]>
  /** What acts inside cells: the first exchange or specified flow of each cell (-1: none), and the next after each. */
  firstInside: { exchanges: Int32Array; flows: Int32Array }
  nextInside: { exchanges: Int32Array; flows: Int32Array }
  wellsIn: Map<number, number[]>
  /** The block of cells round a well that a cell belongs to, where everything that enters it ends in the well. */
  radialTo: Map<number, RadialBlock>
}

interface RadialBlock {
  well: number
  /** Cells between the well's own and the outline. */
  margin: number
  /** What flows through the block from side to side, beside what flows to the well: a velocity. */
  drift: [x: number, y: number]
}

export type Direction = 'forward' | 'back'

/** Where a tracked line came to its end. `cell` is the last one it was in. */
export interface Track {
  end: 'face' | 'inside' | 'well' | 'stagnation' | 'dry' | 'time' | 'limit'
  cell: number
  /** The outer face it left through, else -1. */
  face: number
  /** Index of the well that ended it, else -1. */
  well: number
  x: number
  y: number
  time: number
  /** Indices of wells that take part of what flows through cells it passed. */
  passed: number[]
  /** With `record`: x, y and time of every vertex. */
  path: number[]
}

/**
 * Refuses ground without porosity where travel times are asked for, and wishes for lines that start nowhere. `path` of
 * the error is the material's or the wish's.
 */
export function checkFlowLines(d: Discretised): void {
  const want = d.model.want
  if ((want?.flowLines?.length ?? 0) === 0 && !want?.captureZones) return
  const used = new Set(d.profiles.flatMap((profile) => profile.material))
  d.model.materials.forEach((material, index) => {
    if (used.has(index) && material.porosity === undefined) {
      throw new ModelError(
        `materials[${index}].porosity`,
        `is needed for travel times: "${material.name}" has none`,
      )
    }
  })
  for (const [index, wish] of (want?.flowLines ?? []).entries()) startsOf(d, wish, `want.flowLines[${index}]`)
  for (const [index, time] of (want?.captureZones?.times ?? []).entries()) {
    if (!(requireFinite(time, `want.captureZones.times[${index}]`) > 0)) {
      throw new ModelError(`want.captureZones.times[${index}]`, 'must be greater than zero')
    }
  }
}

function startsOf(d: Discretised, wish: FlowLineWish, path: string): { well: PlacedWell } | { cell: number } {
  if ('well' in wish) {
    const well = d.wells.find((entry) => entry.name === wish.well)
    if (!well) throw new ModelError(`${path}.well`, `there is no well "${wish.well}"`)
    return { well }
  }
  const x = requireFinite(wish.from[0], `${path}.from[0]`)
  const y = requireFinite(wish.from[1], `${path}.from[1]`)
  const cell = cellAt(d.grid, x, y)
  if (cell < 0) throw new ModelError(`${path}.from`, `(${x}, ${y}) lies outside the extent`)
  if (d.active[cell] !== 1) throw new ModelError(`${path}.from`, `there is no ground at (${x}, ${y})`)
  return { cell }
}

/** The velocities of an outcome with these flows. */
export function velocitiesOf(flows: FlowField, { flow, heads, rates, saturation }: Outcome): Velocities {
  const { d } = flow
  const { grid } = d
  const through = new Float64Array(faceCount(grid))
  for (let face = 0; face < through.length; face++) through[face] = flows.atFace(face)
  for (const [face, q] of flows.atOuterFaces) {
    const { low } = faceOf(grid, face)
    const towardsHigh = low < 0 || d.active[low] !== 1
    through[face] = (through[face] as number) + (towardsHigh ? q : -q)
  }
  const field: Velocities = {
    flow,
    grid,
    through,
    pore: poreWater(d, heads, saturation),
    heads,
    rates,
    exchangesAt: new Map(),
    flowsAt: new Map(),
    firstInside: {
      exchanges: new Int32Array(heads.length).fill(-1),
      flows: new Int32Array(heads.length).fill(-1),
    },
    nextInside: {
      exchanges: new Int32Array(d.exchanges.length).fill(-1),
      flows: new Int32Array(d.specifiedFlows.length).fill(-1),
    },
    wellsIn: new Map(),
    radialTo: new Map(),
  }
  function inside(kind: 'exchanges' | 'flows', cell: number, index: number): void {
    field.nextInside[kind][index] = field.firstInside[kind][cell] as number
    field.firstInside[kind][cell] = index
  }
  d.exchanges.forEach((exchange, index) => {
    if (exchange.face < 0) {
      inside('exchanges', exchange.cell, index)
      return
    }
    listed(field.exchangesAt, exchange.face).push(index)
  })
  d.specifiedFlows.forEach(({ face, cell }, index) => {
    if (face < 0) {
      inside('flows', cell, index)
      return
    }
    listed(field.flowsAt, face).push(index)
  })
  d.wells.forEach((well, index) => {
    for (const { cell } of well.shares) listed(field.wellsIn, cell).push(index)
  })
  d.wells.forEach((_, index) => {
    markRadial(field, index)
  })
  return field
}

interface Block {
  i0: number
  i1: number
  j0: number
  j1: number
}

/** The cells that share a well and `margin` more on every side, cut at the extent. */
function blockRound(grid: Grid, well: PlacedWell, margin: number): Block {
  const columns = well.shares.map(({ cell }) => cell % grid.columns)
  const rows = well.shares.map(({ cell }) => Math.floor(cell / grid.columns))
  return {
    i0: Math.max(0, Math.min(...columns) - margin),
    i1: Math.min(grid.columns - 1, Math.max(...columns) + margin),
    j0: Math.max(0, Math.min(...rows) - margin),
    j1: Math.min(grid.rows - 1, Math.max(...rows) + margin),
  }
}

function profileAt(d: Discretised, cell: number): Profile {
  return d.profiles[d.profileOf[cell] as number] as Profile
}

const widestMargin = 3

/**
 * Close to a well neither a velocity linear between faces nor the flows of a five-point grid follow the radial flow
 * (on the grid's axes they are 11 % too high two cells away, 3 % four). So the block of its cells and up to three more
 * on every side is treated as radial flow with an even drift, where its ground is one, nothing else acts in it and all
 * its outline flows to the well.
 */
function markRadial(field: Velocities, index: number): void {
  for (let margin = widestMargin; margin >= 1; margin--) if (markBlock(field, index, margin)) return
}

function markBlock(field: Velocities, index: number, margin: number): boolean {
  const { grid, through, pore, flow } = field
  const { d } = flow
  const { columns, xEdges, yEdges } = grid
  const rate = field.rates[index] as number
  if (rate === 0) return false
  const { i0, i1, j0, j1 } = blockRound(grid, d.wells[index] as PlacedWell, margin)
  const split = columnFaceCount(grid)
  const towards = rate < 0 ? 1 : -1
  const cells: number[] = []
  const ground = profileAt(d, (d.wells[index] as PlacedWell).shares[0]?.cell as number)
  if (ground.kxy.some((cross) => cross !== 0)) return false
  let [qx, qy, water] = [0, 0, 0]
  for (let j = j0; j <= j1; j++) {
    for (let i = i0; i <= i1; i++) {
      const cell = j * columns + i
      const west = j * (columns + 1) + i
      const south = split + cell
      if (d.active[cell] !== 1 || (d.fixedBy[cell] as number) >= 0 || field.radialTo.has(cell)) return false
      if ((field.wellsIn.get(cell) ?? []).some((other) => other !== index)) return false
      if (profileAt(d, cell).material.join() !== ground.material.join()) return false
      const faces = [west, west + 1, south, south + columns]
      if (faces.some((face) => (d.wallShare[face] as number) > 0)) return false
      const outline: [at: boolean, face: number, inward: 1 | -1][] = [
        [i === i0, west, 1],
        [i === i1, west + 1, -1],
        [j === j0, south, 1],
        [j === j1, south + columns, -1],
      ]
      for (const [at, face, inward] of outline) {
        if (!at) continue
        const q = through[face] as number
        if (!(towards * inward * q > 0)) return false
        if (face < split) qx += q / 2
        else qy += q / 2
      }
      water += pore[cell] as number
      cells.push(cell)
    }
  }
  water /= cells.length
  const drift: [number, number] = [
    qx / (water * ((yEdges[j1 + 1] as number) - (yEdges[j0] as number))),
    qy / (water * ((xEdges[i1 + 1] as number) - (xEdges[i0] as number))),
  ]
  for (const cell of cells) field.radialTo.set(cell, { well: index, margin, drift })
  return true
}

function listed(map: Map<number, number[]>, key: number): number[] {
  const found = map.get(key)
  if (found) return found
  const list: number[] = []
  map.set(key, list)
  return list
}

function poreWater(d: Discretised, heads: Float64Array, saturation: Float64Array | null): Float64Array {
  const pore = new Float64Array(heads.length)
  const porosities = d.model.materials.map((material) => material.porosity ?? 0)
  for (let cell = 0; cell < pore.length; cell++) {
    if (d.active[cell] !== 1) continue
    const profile = profileAt(d, cell)
    const top = profile.top[profile.top.length - 1] as number
    const level = d.unconfined ? (heads[cell] as number) : top
    if (d.unconfined && thicknessAt(profile, level) <= 0) continue
    let sum = 0
    for (let layer = 0; layer < profile.base.length; layer++) {
      const base = profile.base[layer] as number
      const wet = Math.min(level, profile.top[layer] as number) - base
      if (wet > 0) sum += (porosities[profile.material[layer] as number] as number) * wet
    }
    pore[cell] = sum * (saturation ? (saturation[cell] as number) : 1)
  }
  return pore
}

/** A flow this much smaller than the largest at its cell is what the solve leaves open, not a way out. */
const nothing = 1e-9

export interface TrackOptions {
  record?: boolean
  /** Stop after this time. */
  within?: number
  /** Cells to start in, where (x, y) lies on a face between two. */
  cell?: number
}

/**
 * Follows the water from (x, y) with the flow or against it: within a cell each velocity component varies linearly
 * between its two faces, which gives position and time of leaving in closed form (Pollock 1988, Ground Water 26(6),
 * 743-750). Velocity is face flow / (porosity x saturated thickness x width). A well's cell that lets nothing out
 * ends the line, and so does the block round a well that takes all that enters it, with the time of radial flow from
 * there; a well that lets water pass is listed and passed.
 */
export function track(
  field: Velocities,
  x: number,
  y: number,
  direction: Direction,
  { record = false, within = Number.POSITIVE_INFINITY, cell: startCell = -1 }: TrackOptions = {},
): Track {
  const { grid, through, pore, flow } = field
  const { d } = flow
  const { columns, rows, xEdges, yEdges } = grid
  const split = columnFaceCount(grid)
  const sign = direction === 'forward' ? 1 : -1
  let cell = startCell >= 0 ? startCell : cellAt(grid, x, y)
  const found: Track = { end: 'limit', cell, face: -1, well: -1, x, y, time: 0, passed: [], path: [] }
  if (record) found.path.push(x, y, 0)
  const mostSteps = 40 * (columns + rows) + 1000
  let idle = 0
  for (let step = 0; step < mostSteps; step++) {
    found.cell = cell
    const j = Math.floor(cell / columns)
    const i = cell - j * columns
    const w = xEdges[i] as number
    const e = xEdges[i + 1] as number
    const s = yEdges[j] as number
    const n = yEdges[j + 1] as number
    const westFace = j * (columns + 1) + i
    const southFace = split + cell
    const water = pore[cell] as number
    const qw = sign * (through[westFace] as number)
    const qe = sign * (through[westFace + 1] as number)
    const qs = sign * (through[southFace] as number)
    const qn = sign * (through[southFace + columns] as number)
    const perX = 1 / (water * (n - s))
    const perY = 1 / (water * (e - w))
    const least = nothing * Math.max(Math.abs(qw), Math.abs(qe), Math.abs(qs), Math.abs(qn))
    const wells = field.wellsIn.get(cell)
    if (water === 0) return ended('dry')
    if (step > 0 && (d.fixedBy[cell] as number) >= 0) return ended('inside')
    if (!(qw < -least || qe > least || qs < -least || qn > least)) {
      if (wells) return atWell(wells)
      return ended(least > 0 ? 'inside' : 'stagnation')
    }
    const near = field.radialTo.get(cell)
    if (near && sign * (field.rates[near.well] as number) < 0) return atWell([near.well])
    const slopeX = ((qe - qw) * perX) / (e - w)
    const slopeY = ((qn - qs) * perY) / (n - s)
    const vx = qw * perX + slopeX * (x - w)
    const vy = qs * perY + slopeY * (y - s)
    const tx = timeToLeave(vx, slopeX, vx > 0 ? e - x : w - x, vx > 0 ? qe > least : qw < -least)
    const ty = timeToLeave(vy, slopeY, vy > 0 ? n - y : s - y, vy > 0 ? qn > least : qs < -least)
    const t = Math.min(tx, ty)
    if (t === Number.POSITIVE_INFINITY) {
      if (wells) return atWell(wells)
      return ended(hasInside(field, cell) ? 'inside' : 'stagnation')
    }
    if (found.time + t >= within) {
      const rest = within - found.time
      x = between(x + moved(vx, slopeX, rest), w, e)
      y = between(y + moved(vy, slopeY, rest), s, n)
      found.time = within
      return ended('time')
    }
    if (wells) {
      for (const well of wells) {
        if (sign * (field.rates[well] as number) < 0 && !found.passed.includes(well)) found.passed.push(well)
      }
    }
    const throughX = tx <= ty
    if (throughX) {
      y = between(y + moved(vy, slopeY, t), s, n)
      x = vx > 0 ? e : w
    } else {
      x = between(x + moved(vx, slopeX, t), w, e)
      y = vy > 0 ? n : s
    }
    found.time += t
    if (record) found.path.push(x, y, found.time)
    const towardsHigh = (throughX ? vx : vy) > 0
    const face = throughX ? westFace + (towardsHigh ? 1 : 0) : southFace + (towardsHigh ? columns : 0)
    const next = throughX ? cell + (towardsHigh ? 1 : -1) : cell + (towardsHigh ? columns : -columns)
    const beyond = throughX ? (towardsHigh ? i + 1 < columns : i > 0) : towardsHigh ? j + 1 < rows : j > 0
    if (!beyond || d.active[next] !== 1) {
      found.face = face
      return ended('face')
    }
    idle = t > 0 ? 0 : idle + 1
    if (idle > 8) return ended('stagnation')
    cell = next
  }
  return ended('limit')

  function ended(end: Track['end']): Track {
    found.end = end
    found.x = x
    found.y = y
    if (record && end === 'time') found.path.push(x, y, found.time)
    return found
  }

  /** The rest of the way, straight to the well. */
  function atWell(wells: number[]): Track {
    let largest = -1
    let rate = 0
    for (const index of wells) {
      const own = -sign * (field.rates[index] as number)
      if (own > rate) {
        rate = own
        largest = index
      }
    }
    if (largest < 0) return ended(hasInside(field, cell) ? 'inside' : 'stagnation')
    const well = d.wells[largest] as PlacedWell
    const t = radialTime(field, well, rate, sign, cell, x, y)
    const share = found.time + t > within ? Math.sqrt(1 - (within - found.time) / t) : 0
    const square = (x - well.x) ** 2 + (y - well.y) ** 2
    x = well.x + share * (x - well.x)
    y = well.y + share * (y - well.y)
    found.time = Math.min(within, found.time + t)
    if (record && square > 0) found.path.push(x, y, found.time)
    found.end = share > 0 ? 'time' : 'well'
    found.x = x
    found.y = y
    if (share === 0) found.well = largest
    found.passed = found.passed.filter((index) => index !== largest)
    return found
  }
}

/**
 * Time from (x, y) straight to a well that draws `rate` (its magnitude): dr/dt = rate / (2 pi r n b) + c, where c is
 * the drift of the well's block along the way. Where conductivity has directions, r is stretched so that the
 * flow is radial (ellipses of equal time, the area kept).
 */
function radialTime(
  field: Velocities,
  well: PlacedWell,
  rate: number,
  sign: number,
  cell: number,
  x: number,
  y: number,
): number {
  const { d } = field.flow
  const water = field.pore[cell] as number
  const profile = profileAt(d, cell)
  const root = Math.sqrt((profile.ky[0] as number) / (profile.kx[0] as number))
  const stretch = Math.sqrt(root)
  const dx = (x - well.x) * stretch
  const dy = (y - well.y) / stretch
  const r = Math.hypot(dx, dy)
  if (r === 0) return 0
  const a = rate / (2 * Math.PI * water)
  const [vx, vy] = field.radialTo.get(cell)?.drift ?? [0, 0]
  const extra = (-sign * (vx * stretch * dx + (vy / stretch) * dy)) / a
  // t = r / c - a / c^2 ln(1 + c r / a), by its series where c r is small beside a.
  const plain = (r * r) / (2 * a)
  if (extra <= -0.95) return plain
  if (Math.abs(extra) < 1e-3) return plain * (1 - (2 / 3) * extra)
  return ((r * r) / a) * ((extra - Math.log1p(extra)) / (extra * extra))
}

/** Time until a coordinate has moved by `distance` (of the velocity's sign), infinite where it never gets there. */
function timeToLeave(velocity: number, slope: number, distance: number, open: boolean): number {
  if (velocity === 0 || !open) return Number.POSITIVE_INFINITY
  if (distance === 0) return 0
  const growth = (slope * distance) / velocity
  if (growth <= -1) return Number.POSITIVE_INFINITY
  if (Math.abs(growth) < 1e-9) return distance / velocity
  return Math.log1p(growth) / slope
}

function moved(velocity: number, slope: number, time: number): number {
  const exponent = slope * time
  return Math.abs(exponent) < 1e-12 ? velocity * time : (velocity * Math.expm1(exponent)) / slope
}

function between(value: number, low: number, high: number): number {
  return Math.min(Math.max(value, low), high)
}

/** Does anything add water to the cell or take it, other than its faces and wells? */
function hasInside(field: Velocities, cell: number): boolean {
  const { d } = field.flow
  return (
    (d.fixedBy[cell] as number) >= 0 ||
    (field.firstInside.exchanges[cell] as number) >= 0 ||
    (field.firstInside.flows[cell] as number) >= 0 ||
    d.recharge[cell] !== 0
  )
}

/** The name of what ended a tracked line. */
export function endOf(field: Velocities, found: Track, direction: Direction): FlowLineEnd {
  const { d } = field.flow
  const { model } = d
  switch (found.end) {
    case 'well':
      return { at: 'well', name: (d.wells[found.well] as PlacedWell).name }
    case 'face':
      return strongest(field, listOf(field, 'face', found.face), direction) ?? { at: 'edge' }
    case 'inside': {
      const by = d.fixedBy[found.cell] as number
      if (by >= 0) return { at: 'boundary', name: model.boundaries?.[by]?.name ?? '' }
      const other = strongest(field, listOf(field, 'cell', found.cell), direction)
      if (other) return other
      if (direction === 'back' && (d.recharge[found.cell] as number) > 0) {
        return { at: 'recharge', name: rechargeAt(model, found.x, found.y) }
      }
      return { at: 'stagnation' }
    }
    case 'dry':
      return { at: 'dry ground' }
    case 'time':
      return { at: 'time' }
    case 'limit':
      return { at: 'limit' }
    default:
      return { at: 'stagnation' }
  }
}

interface Acting {
  exchanges: number[]
  flows: number[]
}

function listOf(field: Velocities, where: 'face' | 'cell', at: number): Acting {
  if (where === 'face') {
    return { exchanges: field.exchangesAt.get(at) ?? [], flows: field.flowsAt.get(at) ?? [] }
  }
  function chain(kind: 'exchanges' | 'flows'): number[] {
    const list: number[] = []
    let index = field.firstInside[kind][at] as number
    for (; index >= 0; index = field.nextInside[kind][index] as number) list.push(index)
    return list
  }
  return { exchanges: chain('exchanges'), flows: chain('flows') }
}

/** Of all that acts what takes most water, or backwards gives most. */
function strongest(field: Velocities, acting: Acting, direction: Direction): FlowLineEnd | null {
  const { d } = field.flow
  const sign = direction === 'forward' ? -1 : 1
  let most = 0
  let found: FlowLineEnd | null = null
  const out: FaceFlow = { q: 0, byLow: 0, byHigh: 0 }
  for (const index of acting.exchanges) {
    const exchange = d.exchanges[index] as Discretised['exchanges'][number]
    exchangeFlow(field.flow, exchange, field.heads[exchange.cell] as number, out)
    if (sign * out.q <= most) continue
    most = sign * out.q
    const rows = exchange.owner === 'leakage' ? d.model.leakage : d.model.boundaries
    const at = exchange.owner === 'leakage' ? 'leakage' : 'boundary'
    found = { at, name: rows?.[exchange.index]?.name ?? '' }
  }
  for (const index of acting.flows) {
    const flow = d.specifiedFlows[index] as Discretised['specifiedFlows'][number]
    if (sign * flow.rate <= most) continue
    most = sign * flow.rate
    found = { at: 'boundary', name: d.model.boundaries?.[flow.index]?.name ?? '' }
  }
  return found
}

function rechargeAt(model: Model, x: number, y: number): string {
  const found = (model.recharge ?? []).filter((entry) => !entry.polygon || isInside(entry.polygon, x, y))
  return found.map((entry) => entry.name).join(', ')
}

/** A place on the ring round a well's cells, the cell outside it, and the time between there and the well. */
export interface RingStart {
  x: number
  y: number
  cell: number
  time: number
}

/**
 * The ring round the cells that share a well, as a function of the share of the water that crosses it before a place:
 * 0 at the lowest corner, anticlockwise to 1, so that equal steps carry equal flow. Null where nothing crosses it.
 */
export function ringRound(
  field: Velocities,
  well: PlacedWell,
  direction: Direction,
): ((share: number) => RingStart) | null {
  const { grid, through, flow } = field
  const { columns, rows, xEdges, yEdges } = grid
  const split = columnFaceCount(grid)
  const number = flow.d.wells.indexOf(well)
  const own = field.radialTo.get((well.shares[0] as PlacedWell['shares'][number]).cell)
  const margin = own?.well === number ? own.margin : 0
  const { i0, i1, j0, j1 } = blockRound(grid, well, margin)
  const ring: { from: Position; to: Position; cell: number; inside: number; q: number }[] = []
  // Against the flow the lines leave an abstraction well where water comes in, with the flow where it goes out.
  const sign = direction === 'back' ? 1 : -1
  const rate = Math.abs(field.rates[number] as number)
  function add(from: Position, to: Position, beyond: boolean, cell: number, inside: number, face: number) {
    const inward = cell < inside ? 1 : -1
    const q = sign * inward * (through[face] as number)
    if (q > 0 && beyond && flow.d.active[cell] === 1) ring.push({ from, to, cell, inside, q })
  }
  const x = (i: number) => xEdges[i] as number
  const y = (j: number) => yEdges[j] as number
  for (let i = i0; i <= i1; i++) {
    const inside = j0 * columns + i
    add([x(i), y(j0)], [x(i + 1), y(j0)], j0 > 0, inside - columns, inside, split + inside)
  }
  for (let j = j0; j <= j1; j++) {
    const inside = j * columns + i1
    const face = j * (columns + 1) + i1 + 1
    add([x(i1 + 1), y(j)], [x(i1 + 1), y(j + 1)], i1 + 1 < columns, inside + 1, inside, face)
  }
  for (let i = i1; i >= i0; i--) {
    const inside = j1 * columns + i
    const face = split + inside + columns
    add([x(i + 1), y(j1 + 1)], [x(i), y(j1 + 1)], j1 + 1 < rows, inside + columns, inside, face)
  }
  for (let j = j1; j >= j0; j--) {
    const inside = j * columns + i0
    const face = j * (columns + 1) + i0
    add([x(i0), y(j + 1)], [x(i0), y(j)], i0 > 0, inside - 1, inside, face)
  }
  const total = ring.reduce((sum, piece) => sum + piece.q, 0)
  if (!(total > 0)) return null
  return (share) => {
    let left = (share - Math.floor(share)) * total
    let piece = ring[ring.length - 1] as (typeof ring)[number]
    for (const candidate of ring) {
      if (left <= candidate.q) {
        piece = candidate
        break
      }
      left -= candidate.q
    }
    const t = between(left / piece.q, 0, 1)
    const px = piece.from[0] + t * (piece.to[0] - piece.from[0])
    const py = piece.from[1] + t * (piece.to[1] - piece.from[1])
    const time = radialTime(field, well, rate, sign, piece.inside, px, py)
    return { x: px, y: py, cell: piece.cell, time }
  }
}

const usualLines = 16

/**
 * The flow lines the model asks for. Times count from the start, against the flow too. A wish for lines round a well
 * gives that many results, each carrying the same share of its water.
 */
export function flowLineResults(field: Velocities): FlowLineResult[] {
  const { d } = field.flow
  return (d.model.want?.flowLines ?? []).flatMap((wish, index) => {
    const start = startsOf(d, wish, `want.flowLines[${index}]`)
    if ('cell' in start) {
      const [x, y] = (wish as { from: Position }).from
      const found = track(field, x, y, wish.direction, { record: true, cell: start.cell })
      return [lineResult(field, found, wish.direction, 0)]
    }
    const ring = ringRound(field, start.well, wish.direction)
    if (!ring) return []
    const count = ('well' in wish ? wish.lines : undefined) ?? usualLines
    return Array.from({ length: count }, (_, k) => {
      const { x, y, cell, time } = ring((k + 0.5) / count)
      const found = track(field, x, y, wish.direction, { record: true, cell })
      found.path.unshift(start.well.x, start.well.y, -time)
      return { ...lineResult(field, found, wish.direction, time), well: start.well.name }
    })
  })
}

function lineResult(field: Velocities, found: Track, direction: Direction, before: number): FlowLineResult {
  const { d } = field.flow
  const { line, times } = thinned(field.grid, found.path)
  const end = endOf(field, found, direction)
  const { passed } = found
  return {
    direction,
    line,
    times: times.map((time) => time + before),
    time: found.time + before,
    ended: end,
    ...(passed.length > 0 ? { passed: passed.map((index) => (d.wells[index] as PlacedWell).name) } : {}),
  }
}

/**
 * Leaves out vertices that move the line by less than a tenth of the grid's mean cell and its times by less than 0.2 %
 * of the whole (Douglas & Peucker 1973, with the time as a third coordinate). `path`: x, y, time in turn.
 */
export function thinned(grid: Grid, path: number[]): { line: Position[]; times: number[] } {
  const count = path.length / 3
  const width = (grid.xEdges[grid.columns] as number) - (grid.xEdges[0] as number)
  const height = (grid.yEdges[grid.rows] as number) - (grid.yEdges[0] as number)
  const near = 0.1 * Math.min(width / grid.columns, height / grid.rows)
  const span = Math.abs((path[path.length - 1] as number) - (path[2] as number))
  const perTime = span > 0 ? near / (0.002 * span) : 0
  const kept = new Uint8Array(count)
  kept[0] = 1
  kept[count - 1] = 1
  const open: [number, number][] = [[0, count - 1]]
  for (let piece = open.pop(); piece; piece = open.pop()) {
    const [a, b] = piece
    let worst = near
    let at = -1
    for (let k = a + 1; k < b; k++) {
      const away = distance(path, a, b, k, perTime)
      if (away > worst) {
        worst = away
        at = k
      }
    }
    if (at < 0) continue
    kept[at] = 1
    open.push([a, at], [at, b])
  }
  const line: Position[] = []
  const times: number[] = []
  for (let k = 0; k < count; k++) {
    if (kept[k] === 0) continue
    line.push([path[3 * k] as number, path[3 * k + 1] as number])
    times.push(path[3 * k + 2] as number)
  }
  return { line, times }
}

/** From vertex k to the chord from a to b, times counted as lengths. */
function distance(path: number[], a: number, b: number, k: number, perTime: number): number {
  const at = (vertex: number, axis: 0 | 1 | 2) =>
    (path[3 * vertex + axis] as number) * (axis === 2 ? perTime : 1)
  const d = ([0, 1, 2] as const).map((axis) => at(b, axis) - at(a, axis))
  const p = ([0, 1, 2] as const).map((axis) => at(k, axis) - at(a, axis))
  const square = d.reduce((sum, value) => sum + value * value, 0)
  const along = p.reduce((sum, value, axis) => sum + value * (d[axis] as number), 0)
  const t = square > 0 ? between(along / square, 0, 1) : 0
  return Math.hypot(...p.map((value, axis) => value - t * (d[axis] as number)))
}

import { addCornerFlows, cornerFlowAtFace } from './corner-flow'
import type { Discretised, Exchange } from './discretise'
import { columnFaceCount, faceOf } from './faces'
import type { Profile } from './ground'
import { transmissivityAt } from './ground'
import { levelAtFace, levelOfPotential, type Potential, potentialAt, slopeAt } from './saturated'
import { type ProfileStorage, storageOf, storageSlopeAt, storedAt } from './storage'

/**
 * The linear system of one Newton step, by cell: diag y - west y_w - east y_e - south y_s - north y_n = imbalance.
 * The unknown y is the change of head times `weight` (1 in confined flow, the saturated thickness in unconfined flow,
 * which makes the system symmetric over a flat base and the step exact in h^2). In confined flow west and east, south
 * and north look into the same memory, one cell apart.
 */
export interface Matrix {
  diag: Float64Array
  west: Float64Array
  east: Float64Array
  south: Float64Array
  north: Float64Array
  weight: Float64Array
  /** The part of the diagonal that ties a cell to what is held or known, without its links to free cells. */
  own: Float64Array
  /** Links to the four cells at the corners, where directions of conductivity are oblique; may be negative. */
  corners: CornerMatrix | null
  symmetric: boolean
}

/** Links of the matrix to corner cells; where symmetric, opposite ones look into the same memory. */
export interface CornerMatrix {
  southWest: Float64Array
  southEast: Float64Array
  northWest: Float64Array
  northEast: Float64Array
}

/**
 * Storage over one implicit step: each cell's inflow is (stored(h) - before) / interval. `before` holds a volume a
 * cell, `interval` a time.
 */
export interface StorageTerm {
  interval: number
  before: Float64Array
}

export interface FlowState {
  /** Net inflow of each cell: what does not balance. In a cell held at a head, the flow its boundary takes out. */
  imbalance: Float64Array
  /** Sum of the magnitudes of what enters and leaves each cell from outside the free cells. */
  forcing: Float64Array
}

/** Flow functions of one profile: along x, along y, and of the thickness alone. */
export interface ProfileFlow {
  x: Potential
  y: Potential
  thickness: Potential
  /** The profile is one layer: its conductivity along x and y. */
  single: boolean
  base: number
  top: number
  kx: number
  ky: number
}

export interface FlowModel {
  d: Discretised
  /** Unconfined: by profile. Confined: empty. */
  flows: ProfileFlow[]
  /** Confined: transmissivity along x and y by profile. Unconfined: empty. */
  fullX: number[]
  fullY: number[]
  film: number
  /** What profiles store, in transient models; empty in steady ones. */
  storage: ProfileStorage[]
  /** Area of every cell, in transient models; empty in steady ones. */
  areas: Float64Array
  /** Volume stored by every cell for a unit of head, in confined transient models; else null. */
  capacities: Float64Array | null
  /** Levels at which what a cell exchanges bends: those of drains, and those below which rivers draw no more. */
  bends: { cell: number; level: number }[]
  /** Does a change of head change every flow in proportion? Then one step solves it. */
  linear: boolean
}

/**
 * What the flow between cells needs and no head changes: transmissivities [length²/time] where confined, profiles
 * with their film [length], which keeps dry cells in the equations, where unconfined.
 */
export function flowModelOf(d: Discretised): FlowModel {
  const linear =
    !d.unconfined &&
    d.exchanges.every(({ kind, floor }) => {
      return kind !== 'drain' && kind !== 'seepage' && floor === Number.NEGATIVE_INFINITY
    })
  // With a free surface storage is a matter of saturation: section-balance.ts.
  const stores = d.model.time.kind === 'transient' && d.model.flow !== 'free surface'
  const storage = stores ? storageOf(d) : []
  const areas = stores ? areasOf(d) : new Float64Array(0)
  const capacities = stores && !d.unconfined ? capacitiesOf(d, areas, storage) : null
  const bends = d.exchanges.flatMap(({ kind, cell, head, floor }) => {
    const level = kind === 'drain' || kind === 'seepage' ? head : floor
    return level > Number.NEGATIVE_INFINITY && kind !== 'fixed' ? [{ cell, level }] : []
  })
  if (!d.unconfined) {
    const level = (profile: Profile) => profile.top[profile.top.length - 1] as number
    const fullX = d.profiles.map((profile) => transmissivityAt(profile, profile.kx, level(profile)))
    const fullY = d.profiles.map((profile) => transmissivityAt(profile, profile.ky, level(profile)))
    return { d, flows: [], fullX, fullY, film: 0, storage, areas, capacities, bends, linear }
  }
  let lowest = Number.POSITIVE_INFINITY
  for (const profile of d.profiles) lowest = Math.min(lowest, profile.base[0] as number)
  const film = 1e-6 * Math.max(d.highestHead - lowest, 1e-3)
  const flows = d.profiles.map((profile) => ({
    x: { profile, k: profile.kx, film },
    y: { profile, k: profile.ky, film },
    thickness: { profile, k: profile.kx.map(() => 1), film },
    single: profile.kx.length === 1,
    base: profile.base[0] as number,
    top: profile.top[0] as number,
    kx: profile.kx[0] as number,
    ky: profile.ky[0] as number,
  }))
  return { d, flows, fullX: [], fullY: [], film, storage, areas, capacities, bends, linear }
}

function areasOf({ grid: { columns, rows, xEdges, yEdges } }: Discretised): Float64Array {
  const areas = new Float64Array(columns * rows)
  for (let j = 0; j < rows; j++) {
    const height = (yEdges[j + 1] as number) - (yEdges[j] as number)
    for (let i = 0; i < columns; i++) {
      areas[j * columns + i] = height * ((xEdges[i + 1] as number) - (xEdges[i] as number))
    }
  }
  return areas
}

function capacitiesOf(
  { active, profileOf }: Discretised,
  areas: Float64Array,
  storage: ProfileStorage[],
): Float64Array {
  return areas.map((area, cell) => {
    return active[cell] === 1 ? area * (storage[profileOf[cell] as number] as ProfileStorage).full : 0
  })
}

/** A matrix of zeros for the model's cells; symmetric where confined, where opposite faces share their coefficient. */
export function emptyMatrix(model: FlowModel): Matrix {
  const { columns, rows } = model.d.grid
  const n = columns * rows
  const diag = new Float64Array(n)
  const weight = new Float64Array(n).fill(1)
  const own = new Float64Array(n)
  if (model.d.unconfined) {
    const [west, east, south, north] = [0, 1, 2, 3].map(() => new Float64Array(n)) as [
      Float64Array,
      Float64Array,
      Float64Array,
      Float64Array,
    ]
    const [southWest, southEast, northWest, northEast] = [0, 1, 2, 3].map(() => new Float64Array(n)) as [
      Float64Array,
      Float64Array,
      Float64Array,
      Float64Array,
    ]
    const corners = model.d.corners ? { southWest, southEast, northWest, northEast } : null
    return { diag, west, east, south, north, weight, own, corners, symmetric: false }
  }
  const alongX = new Float64Array(n + 1)
  const alongY = new Float64Array(n + columns)
  return {
    diag,
    corners: model.d.corners ? sharedCorners(n, columns) : null,
    west: alongX.subarray(0, n),
    east: alongX.subarray(1),
    south: alongY.subarray(0, n),
    north: alongY.subarray(columns),
    weight,
    own,
    symmetric: true,
  }
}

function sharedCorners(n: number, columns: number): CornerMatrix {
  const rising = new Float64Array(n + columns + 1)
  const falling = new Float64Array(n + columns - 1)
  return {
    southWest: rising.subarray(0, n),
    northEast: rising.subarray(columns + 1),
    southEast: falling.subarray(0, n),
    northWest: falling.subarray(columns - 1),
  }
}

/** One flow and how it changes: `byLow` = dq/dh of the giving side, `byHigh` = -dq/dh of the taking side; both >= 0. */
export interface FaceFlow {
  q: number
  byLow: number
  byHigh: number
}

/**
 * Flow through the face between cells a and b in unconfined ground, positive from a to b. Half cells and a wall stand
 * in series; the wall counts as that much more length on both sides. One layer over one base: K harmonic, thickness
 * the arithmetic mean, that is exact in h^2. Otherwise the level at the face is found first.
 */
export function unconfinedFlow(
  model: FlowModel,
  axis: 'x' | 'y',
  pa: number,
  pb: number,
  ha: number,
  hb: number,
  la: number,
  lb: number,
  width: number,
  out: FaceFlow,
): void {
  const a = model.flows[pa] as ProfileFlow
  const b = model.flows[pb] as ProfileFlow
  if (pa === pb) {
    const c = width / (la + lb)
    out.q = c * (potentialAt(a[axis], ha) - potentialAt(b[axis], hb))
    out.byLow = c * slopeAt(a[axis], ha)
    out.byHigh = c * slopeAt(b[axis], hb)
    return
  }
  if (a.single && b.single && a.base === b.base && a.top === b.top) {
    const c = axis === 'x' ? width / (la / a.kx + lb / b.kx) : width / (la / a.ky + lb / b.ky)
    out.q = c * (potentialAt(a.thickness, ha) - potentialAt(b.thickness, hb))
    out.byLow = c * slopeAt(a.thickness, ha)
    out.byHigh = c * slopeAt(b.thickness, hb)
    return
  }
  const h = levelAtFace(a[axis], ha, la, b[axis], hb, lb)
  const sa = slopeAt(a[axis], h) / la
  const sb = slopeAt(b[axis], h) / lb
  // Taken on the side with less potential to lose, the difference keeps its digits.
  const qa = (width * (potentialAt(a[axis], ha) - potentialAt(a[axis], h))) / la
  const qb = (width * (potentialAt(b[axis], h) - potentialAt(b[axis], hb))) / lb
  out.q = Math.abs(qa) < Math.abs(qb) ? qa : qb
  out.byLow = ((width * slopeAt(a[axis], ha)) / la) * (sb / (sa + sb))
  out.byHigh = ((width * slopeAt(b[axis], hb)) / lb) * (sa / (sa + sb))
}

const scratch: FaceFlow = { q: 0, byLow: 0, byHigh: 0 }

/** Flow through a face between active cells low and high, positive from low to high, its changes in `out`. */
export function flowThrough(
  model: FlowModel,
  heads: Float64Array,
  face: number,
  axis: 'x' | 'y',
  low: number,
  high: number,
  lowHalf: number,
  highHalf: number,
  width: number,
  out: FaceFlow,
): void {
  const { d } = model
  const ha = heads[low] as number
  const hb = heads[high] as number
  if (!d.unconfined) {
    const c = d.conductance[face] as number
    out.q = c * (ha - hb)
    out.byLow = c
    out.byHigh = c
    return
  }
  const pa = d.profileOf[low] as number
  const pb = d.profileOf[high] as number
  const share = d.wallShare[face] as number
  if (share === 0) {
    unconfinedFlow(model, axis, pa, pb, ha, hb, lowHalf, highHalf, width, out)
    return
  }
  out.q = 0
  out.byLow = 0
  out.byHigh = 0
  const resistance = d.wallResistance[face] as number
  if (resistance !== Number.POSITIVE_INFINITY) {
    const la = lowHalf + 0.5 * resistance * meanConductivity(model, pa, axis)
    const lb = highHalf + 0.5 * resistance * meanConductivity(model, pb, axis)
    unconfinedFlow(model, axis, pa, pb, ha, hb, la, lb, width * share, out)
  }
  if (share < 1) {
    const { q, byLow, byHigh } = out
    unconfinedFlow(model, axis, pa, pb, ha, hb, lowHalf, highHalf, width * (1 - share), out)
    out.q += q
    out.byLow += byLow
    out.byHigh += byHigh
  }
}

/** K over the thickness wet at the highest known level; with one layer simply its K. */
function meanConductivity(model: FlowModel, profile: number, axis: 'x' | 'y'): number {
  const flow = model.flows[profile] as ProfileFlow
  if (flow.single) return axis === 'x' ? flow.kx : flow.ky
  return slopeAt(flow[axis], model.d.highestHead) / slopeAt(flow.thickness, model.d.highestHead)
}

/** Flow through any face between two active cells, positive from its low to its high cell; 0 elsewhere. */
export function flowAtFace(flow: FlowModel, heads: Float64Array, face: number): number {
  const { d } = flow
  const { axis, low, high, length, lowHalf, highHalf } = faceOf(d.grid, face)
  if (low < 0 || high < 0 || d.active[low] !== 1 || d.active[high] !== 1) return 0
  const out: FaceFlow = { q: 0, byLow: 0, byHigh: 0 }
  flowThrough(flow, heads, face, axis, low, high, lowHalf, highHalf, length, out)
  return out.q + (d.corners ? cornerFlowAtFace(flow, d.corners, heads, face) : 0)
}

/** Flow of one exchange into its cell at head `h`; `byHigh` = -dq/dh >= 0. */
export function exchangeFlow(model: FlowModel, exchange: Exchange, h: number, out: FaceFlow): void {
  out.byLow = 0
  if (exchange.face < 0) {
    drawn(exchange, h, out)
    return
  }
  const { d } = model
  const profile = d.profileOf[exchange.cell] as number
  const c = exchange.width / exchange.half
  if (!d.unconfined) {
    const half = c * ((exchange.axis === 'x' ? model.fullX : model.fullY)[profile] as number)
    if (exchange.kind === 'fixed') {
      out.q = half * (exchange.head - h)
      out.byHigh = half
      return
    }
    if (exchange.kind === 'seepage') {
      out.q = Math.min(0, half * (exchange.head - h))
      out.byHigh = h > exchange.head ? half : idleSlope * half
      return
    }
    // The head at the face, with the outer resistance and the half cell in series.
    const series = (exchange.conductance * half) / (exchange.conductance + half)
    const faceHead = h + (series * (exchange.head - h)) / half
    atFace(exchange, faceHead, series * (exchange.head - h), series, out)
    return
  }
  const potential = (model.flows[profile] as ProfileFlow)[exchange.axis]
  if (exchange.kind === 'fixed') {
    out.q = c * (potentialAt(potential, exchange.head) - potentialAt(potential, h))
    out.byHigh = c * slopeAt(potential, h)
    return
  }
  if (exchange.conductance === 0) {
    out.q = 0
    out.byHigh = 0
    return
  }
  let low = Math.min(h, exchange.head)
  let high = Math.max(h, exchange.head)
  const own = c * potentialAt(potential, h)
  let level = 0.5 * (low + high)
  for (let step = 0; step < 80; step++) {
    const excess = c * potentialAt(potential, level) - own - exchange.conductance * (exchange.head - level)
    if (excess > 0) high = level
    else low = level
    let next = level - excess / (c * slopeAt(potential, level) + exchange.conductance)
    if (!(next > low && next < high)) next = 0.5 * (low + high)
    const done = Math.abs(next - level) <= 1e-15 * (Math.abs(level) + high - low)
    level = next
    if (done) break
  }
  const inner = c * slopeAt(potential, level)
  const byHigh = (c * slopeAt(potential, h) * exchange.conductance) / (inner + exchange.conductance)
  atFace(exchange, level, exchange.conductance * (exchange.head - level), byHigh, out)
}

/** A vanishing slope keeps the system regular while a drain is dry or a river cut off; the flow itself is exact. */
const idleSlope = 1e-8

function drawn(exchange: Exchange, h: number, out: FaceFlow): void {
  atFace(exchange, h, exchange.conductance * (exchange.head - h), exchange.conductance, out)
}

function atFace(exchange: Exchange, level: number, q: number, slope: number, out: FaceFlow): void {
  const idle = exchange.kind === 'drain' ? level < exchange.head : level < exchange.floor
  if (!idle) {
    out.q = q
    out.byHigh = slope
    return
  }
  out.q = exchange.kind === 'drain' ? 0 : exchange.conductance * (exchange.head - exchange.floor)
  out.byHigh = idleSlope * slope
}

/**
 * Net inflow of every cell at the given heads, and with `matrix` the system of the next Newton step in place.
 * `rates`: flow of each well into the ground. Nothing is allocated.
 */
export function evaluate(
  model: FlowModel,
  heads: Float64Array,
  rates: ArrayLike<number>,
  state: FlowState,
  matrix: Matrix | null,
  storage: StorageTerm | null = null,
): void {
  const { d } = model
  const { active, fixedBy } = d
  const { imbalance, forcing } = state
  const n = active.length
  imbalance.fill(0)
  forcing.fill(0)
  if (matrix) {
    matrix.diag.fill(0)
    matrix.own.fill(0)
    matrix.west.fill(0)
    matrix.east.fill(0)
    matrix.south.fill(0)
    matrix.north.fill(0)
    if (matrix.corners) for (const link of Object.values(matrix.corners) as Float64Array[]) link.fill(0)
    if (d.unconfined) {
      for (let cell = 0; cell < n; cell++) {
        const profile = d.profileOf[cell] as number
        if (profile >= 0) {
          matrix.weight[cell] = slopeAt(
            (model.flows[profile] as ProfileFlow).thickness,
            heads[cell] as number,
          )
        }
      }
    }
  }
  if (d.unconfined) unconfinedFaces(model, heads, state, matrix)
  else confinedFaces(d, heads, state, matrix)
  if (d.corners) addCornerFlows(model, d.corners, heads, state, matrix)
  for (const exchange of d.exchanges) {
    const { cell } = exchange
    exchangeFlow(model, exchange, heads[cell] as number, scratch)
    imbalance[cell] = (imbalance[cell] as number) + scratch.q
    forcing[cell] = (forcing[cell] as number) + Math.abs(scratch.q)
    if (matrix) matrix.own[cell] = (matrix.own[cell] as number) + scratch.byHigh
    if (matrix) matrix.diag[cell] = (matrix.diag[cell] as number) + scratch.byHigh
  }
  for (let cell = 0; cell < n; cell++) addSource(cell, d.recharge[cell] as number)
  for (const flow of d.specifiedFlows) addSource(flow.cell, flow.rate)
  for (let w = 0; w < d.wells.length; w++) {
    for (const { cell, weight } of (d.wells[w] as (typeof d.wells)[number]).shares) {
      addSource(cell, weight * (rates[w] as number))
    }
  }
  function addSource(cell: number, rate: number): void {
    if (active[cell] !== 1) return
    imbalance[cell] = (imbalance[cell] as number) + rate
    forcing[cell] = (forcing[cell] as number) + Math.abs(rate)
  }
  if (storage) addStorage(model, heads, state, matrix, storage)
  if (!matrix) return
  for (let cell = 0; cell < n; cell++) {
    if (active[cell] !== 1 || (fixedBy[cell] as number) >= 0) {
      matrix.diag[cell] = 1
      matrix.own[cell] = 0
      continue
    }
    matrix.diag[cell] = (matrix.diag[cell] as number) / (matrix.weight[cell] as number)
    matrix.own[cell] = (matrix.own[cell] as number) / (matrix.weight[cell] as number)
  }
}

/** Flows through the faces between cells at constant conductances, into the balances and the matrix. */
function confinedFaces(
  d: Discretised,
  heads: Float64Array,
  { imbalance, forcing }: FlowState,
  matrix: Matrix | null,
): void {
  const { conductance, fixedBy } = d
  const { columns, rows } = d.grid
  const split = columnFaceCount(d.grid)
  for (let j = 0; j < rows; j++) {
    const firstFace = j * (columns + 1) + 1
    for (let i = 0; i < columns; i++) {
      const cell = j * columns + i
      const h = heads[cell] as number
      const held = (fixedBy[cell] as number) >= 0
      let net = imbalance[cell] as number
      // In confined flow a link of the matrix is one number for both its cells. There is none behind the last column.
      const east = i < columns - 1 ? (conductance[firstFace + i] as number) : 0
      if (east !== 0) {
        const q = east * (h - (heads[cell + 1] as number))
        net -= q
        imbalance[cell + 1] = (imbalance[cell + 1] as number) + q
        const otherHeld = (fixedBy[cell + 1] as number) >= 0
        if (held || otherHeld) force(forcing, cell, cell + 1, held, otherHeld, Math.abs(q))
        if (matrix) addLink(matrix, matrix.east, cell, cell + 1, held, otherHeld, east)
      }
      const north = j < rows - 1 ? (conductance[split + cell + columns] as number) : 0
      if (north !== 0) {
        const q = north * (h - (heads[cell + columns] as number))
        net -= q
        imbalance[cell + columns] = (imbalance[cell + columns] as number) + q
        const otherHeld = (fixedBy[cell + columns] as number) >= 0
        if (held || otherHeld) force(forcing, cell, cell + columns, held, otherHeld, Math.abs(q))
        if (matrix) addLink(matrix, matrix.north, cell, cell + columns, held, otherHeld, north)
      }
      imbalance[cell] = net
    }
  }
}

/** What flows between a held cell and a free one forces the free one. */
function force(
  forcing: Float64Array,
  low: number,
  high: number,
  lowHeld: boolean,
  highHeld: boolean,
  q: number,
): void {
  if (highHeld) forcing[low] = (forcing[low] as number) + q
  if (lowHeld) forcing[high] = (forcing[high] as number) + q
}

function addLink(
  { diag, own }: Matrix,
  links: Float64Array,
  low: number,
  high: number,
  lowHeld: boolean,
  highHeld: boolean,
  c: number,
): void {
  diag[low] = (diag[low] as number) + c
  diag[high] = (diag[high] as number) + c
  if (highHeld) own[low] = (own[low] as number) + c
  if (lowHeld) own[high] = (own[high] as number) + c
  if (!lowHeld && !highHeld) links[low] = c
}

/** Flows through the faces between cells of unconfined ground, into the balances and the matrix. */
function unconfinedFaces(
  model: FlowModel,
  heads: Float64Array,
  state: FlowState,
  matrix: Matrix | null,
): void {
  const { d } = model
  const { columns, rows, xEdges, yEdges } = d.grid
  const { active, fixedBy } = d
  const { imbalance, forcing } = state
  const split = columnFaceCount(d.grid)
  for (let j = 0; j < rows; j++) {
    const height = (yEdges[j + 1] as number) - (yEdges[j] as number)
    for (let i = 0; i < columns; i++) {
      const cell = j * columns + i
      if (active[cell] !== 1) continue
      const width = (xEdges[i + 1] as number) - (xEdges[i] as number)
      const fixed = (fixedBy[cell] as number) >= 0
      if (i > 0 && active[cell - 1] === 1) {
        const half = 0.5 * ((xEdges[i] as number) - (xEdges[i - 1] as number))
        flowThrough(
          model,
          heads,
          j * (columns + 1) + i,
          'x',
          cell - 1,
          cell,
          half,
          0.5 * width,
          height,
          scratch,
        )
        add(cell - 1, cell, fixed, matrix ? matrix.east : null, matrix ? matrix.west : null)
      }
      if (j > 0 && active[cell - columns] === 1) {
        const half = 0.5 * ((yEdges[j] as number) - (yEdges[j - 1] as number))
        flowThrough(model, heads, split + cell, 'y', cell - columns, cell, half, 0.5 * height, width, scratch)
        add(cell - columns, cell, fixed, matrix ? matrix.north : null, matrix ? matrix.south : null)
      }
    }
  }
  function add(
    low: number,
    high: number,
    highFixed: boolean,
    lowToHigh: Float64Array | null,
    highToLow: Float64Array | null,
  ): void {
    const { q, byLow, byHigh } = scratch
    const lowFixed = (fixedBy[low] as number) >= 0
    imbalance[low] = (imbalance[low] as number) - q
    imbalance[high] = (imbalance[high] as number) + q
    if (highFixed) forcing[low] = (forcing[low] as number) + Math.abs(q)
    if (lowFixed) forcing[high] = (forcing[high] as number) + Math.abs(q)
    if (!matrix || !lowToHigh || !highToLow) return
    const { diag, own, weight } = matrix
    diag[low] = (diag[low] as number) + byLow
    diag[high] = (diag[high] as number) + byHigh
    if (highFixed) own[low] = (own[low] as number) + byLow
    if (lowFixed) own[high] = (own[high] as number) + byHigh
    if (lowFixed || highFixed) return
    lowToHigh[low] = byHigh / (weight[high] as number)
    highToLow[high] = byLow / (weight[low] as number)
  }
}

function addStorage(
  model: FlowModel,
  heads: Float64Array,
  { imbalance, forcing }: FlowState,
  matrix: Matrix | null,
  { interval, before }: StorageTerm,
): void {
  const { d, areas, capacities, storage, film } = model
  for (let cell = 0; cell < heads.length; cell++) {
    if (d.active[cell] !== 1) continue
    const h = heads[cell] as number
    const own = storage[d.profileOf[cell] as number] as ProfileStorage
    const area = areas[cell] as number
    const stored = capacities ? (capacities[cell] as number) * h : area * storedAt(own, film, h)
    const rate = (stored - (before[cell] as number)) / interval
    imbalance[cell] = (imbalance[cell] as number) - rate
    forcing[cell] = (forcing[cell] as number) + Math.abs(rate)
    if (!matrix) continue
    const capacity = capacities ? (capacities[cell] as number) : area * storageSlopeAt(own, film, h)
    matrix.diag[cell] = (matrix.diag[cell] as number) + capacity / interval
    matrix.own[cell] = (matrix.own[cell] as number) + capacity / interval
  }
}

/** Water stored in every cell at the given heads, from an arbitrary zero; volume, 0 where there is no ground. */
export function storedVolumes(model: FlowModel, heads: Float64Array): Float64Array {
  const { d, areas, capacities, storage, film } = model
  const volumes = new Float64Array(heads.length)
  for (let cell = 0; cell < heads.length; cell++) {
    if (d.active[cell] !== 1) continue
    const h = heads[cell] as number
    const own = storage[d.profileOf[cell] as number] as ProfileStorage
    volumes[cell] = capacities
      ? (capacities[cell] as number) * h
      : (areas[cell] as number) * storedAt(own, film, h)
  }
  return volumes
}

/** Head at `h` after the system's unknown changed by `change`: by the thickness potential in unconfined flow. */
export function headAfter(model: FlowModel, cell: number, h: number, change: number): number {
  if (!model.d.unconfined) return h + change
  const { thickness } = model.flows[model.d.profileOf[cell] as number] as ProfileFlow
  // A small change keeps all its digits by the slope; the potential's difference would lose them.
  const slope = slopeAt(thickness, h)
  if (Math.abs(change) < 1e-9 * slope * slope) return h + change / slope
  return levelOfPotential(thickness, potentialAt(thickness, h) + change)
}

/** Root of the sum of squares over the free cells. */
export function normOfFree(d: Discretised, values: Float64Array): number {
  let sum = 0
  for (let cell = 0; cell < values.length; cell++) {
    if (d.active[cell] === 1 && (d.fixedBy[cell] as number) < 0) sum += (values[cell] as number) ** 2
  }
  return Math.sqrt(sum)
}

import { atFaceHead, type Discretised, type Exchange } from './discretise'
import { columnFaceCount, faceOf } from './faces'
import { type FlowModel, flowModelOf, type StorageTerm } from './flow'
import { centresOf } from './grid'
import { ModelError, requireNotNegative, requirePositive } from './model-error'
import { logRadii, wellTransmissivity } from './well-heads'
import type { PlacedWell } from './wells'

/**
 * The balance of every cell of a vertical section with a free surface, on a fixed grid (Alt 1980; Brezis,
 * Kinderlehrer & Stampacchia 1978; by finite differences Bardet & Tobita 2002). A cell holds a pressure head p >= 0 and
 * a saturation theta <= 1, and p > 0 only where theta = 1: it is wet, or it is above the water table and lets water
 * fall. Through a face flows
 *
 *   C (p - p') and, through a face below a cell, C dz theta of that cell besides,
 *
 * so that between wet cells it is Darcy's flow, water that reaches a cell above the water table falls down its column,
 * and every cell balances. Levels and elevations are above the reference, volumes per unit width.
 */
export interface SectionBalance {
  d: Discretised
  columns: number
  rows: number
  /** Conductance between a cell and the next one east; 0 at edges. */
  east: Float64Array
  /** Conductance between a cell and the next one above; 0 at edges. */
  north: Float64Array
  /** What falls out of a cell through the face below it when it is full: conductance x distance of centres. */
  fall: Float64Array
  /** Elevation of each row's centres. */
  z: Float64Array
  /** Pressure head of cells held at one, NaN elsewhere. A fixed head below a cell's centre does not hold it. */
  held: Float64Array
  terms: Term[]
  /** Inflow that does not depend on the heads, and outflow a full cell gives; both >= 0. */
  source: Float64Array
  sink: Float64Array
  /** Stored volume of a full cell by specific yield, and by pressure head; zeros in steady flow. */
  yields: Float64Array
  compressed: Float64Array
}

/** Flow into a cell from outside: conductance x (level - p), less `gravity` x theta that falls out at its foot. */
export interface Term {
  /** What it belongs to: a boundary's exchange, or else a well by its number. */
  exchange: Exchange | null
  well: number
  cell: number
  conductance: number
  /** Pressure head of the cell at which nothing flows but by gravity. */
  level: number
  gravity: number
  /** Out of the ground only. */
  oneSided: boolean
  /** The inflow stops growing at conductance x cap. */
  cap: number
  /** The most that flows out. */
  most: number
}

/** Pressure heads and saturations of all cells. */
export interface SectionState {
  p: Float64Array
  theta: Float64Array
}

/** Lays the balance out. Throws ModelError where transient flow lacks a specific yield. */
export function sectionBalanceOf(d: Discretised): SectionBalance {
  refuseOblique(d)
  d.model.recharge?.forEach(({ rate }, index) => {
    if (typeof rate === 'number' && rate < 0) {
      throw new ModelError(`recharge[${index}].rate`, 'with a free surface recharge brings water: 0 or more')
    }
  })
  const { columns, rows, xEdges, yEdges } = d.grid
  const count = columns * rows
  const balance: SectionBalance = {
    d,
    columns,
    rows,
    east: new Float64Array(count),
    north: new Float64Array(count),
    fall: new Float64Array(count),
    z: centresOf(yEdges).map((y) => y - d.reference),
    held: new Float64Array(count).fill(Number.NaN),
    terms: [],
    source: new Float64Array(count),
    sink: new Float64Array(count),
    yields: new Float64Array(count),
    compressed: new Float64Array(count),
  }
  const { east, north, fall, z, held, source, sink, yields, compressed } = balance
  const split = columnFaceCount(d.grid)
  const storage = d.model.time.kind === 'transient' ? storageByMaterial(d) : null
  for (let j = 0; j < rows; j++) {
    const height = (yEdges[j + 1] as number) - (yEdges[j] as number)
    for (let i = 0; i < columns; i++) {
      const cell = j * columns + i
      if (d.active[cell] !== 1) continue
      if (i < columns - 1) east[cell] = d.conductance[j * (columns + 1) + i + 1] as number
      if (j < rows - 1) north[cell] = d.conductance[split + cell + columns] as number
      if (j > 0) {
        const below = d.conductance[split + cell] as number
        fall[cell] = below * ((z[j] as number) - (z[j - 1] as number))
      }
      const area = height * ((xEdges[i + 1] as number) - (xEdges[i] as number))
      const material = d.profiles[d.profileOf[cell] as number]?.material[0] as number
      if (storage) {
        yields[cell] = area * (storage.specificYield[material] as number)
        compressed[cell] = area * (storage.specificStorage[material] as number)
      }
      if ((d.fixedBy[cell] as number) < 0) continue
      const p = (d.fixedHead[cell] as number) - (z[j] as number)
      if (p >= -hair(d)) held[cell] = Math.max(0, p)
    }
  }
  function bring(cell: number, rate: number): void {
    if (rate > 0) source[cell] = (source[cell] as number) + rate
    else sink[cell] = (sink[cell] as number) - rate
  }
  for (let cell = 0; cell < count; cell++) if (d.active[cell] === 1) bring(cell, d.recharge[cell] as number)
  for (const { cell, rate } of d.specifiedFlows) bring(cell, rate)
  const flow = flowModelOf(d)
  for (const [number, well] of d.wells.entries()) {
    const limited = well.requested < 0 && Number.isFinite(well.lowestLevel)
    for (const { cell, weight } of well.shares) {
      if (limited) balance.terms.push(wellTerm(balance, flow, number, cell, weight))
      else bring(cell, weight * well.requested)
    }
  }
  for (const exchange of d.exchanges) {
    const term = termOf(balance, exchange)
    if (term) balance.terms.push(term)
  }
  return balance
}

function refuseOblique(d: Discretised): void {
  if (!d.corners) return
  const index = d.model.materials.findIndex(({ angle, kx, ky }) => kx !== ky && (angle ?? 0) % 90 !== 0)
  throw new ModelError(
    `materials[${index}].angle`,
    'with a free surface, principal directions oblique to the grid are not computed: use 0 or 90 degrees',
  )
}

/** Elevations closer than this are the same. */
function hair(d: Discretised): number {
  const { yEdges, rows } = d.grid
  return 1e-9 * ((yEdges[rows] as number) - (yEdges[0] as number))
}

function storageByMaterial(d: Discretised): { specificYield: number[]; specificStorage: number[] } {
  const used = new Set(d.profiles.flatMap((profile) => profile.material))
  const { materials } = d.model
  return {
    specificYield: materials.map(({ name, specificYield }, index) => {
      if (!used.has(index)) return 0
      const path = `materials[${index}].specificYield`
      if (specificYield === undefined) {
        throw new ModelError(path, `"${name}" needs a specific yield in transient flow with a free surface`)
      }
      if (requirePositive(specificYield, path) > 1)
        throw new ModelError(path, 'is a share of the volume: at most 1')
      return specificYield
    }),
    specificStorage: materials.map(({ specificStorage }, index) =>
      specificStorage === undefined
        ? 0
        : requireNotNegative(specificStorage, `materials[${index}].specificStorage`),
    ),
  }
}

/**
 * An abstraction well with a lowest level: what its cell gives to a level that low (Peaceman 1978), at most the rate
 * asked for.
 */
function wellTerm(
  { d, z, columns }: SectionBalance,
  flow: FlowModel,
  number: number,
  cell: number,
  weight: number,
): Term {
  const well = d.wells[number] as PlacedWell
  const transmissivity = wellTransmissivity(flow, cell, 0)
  // Without a radius the level is the cell's: next to nothing stands between them.
  const resistance = Math.max(logRadii(flow, well, new Float64Array(0)) / (2 * Math.PI), 1e-4)
  return {
    exchange: null,
    well: number,
    cell,
    conductance: (weight * transmissivity) / resistance,
    level: Math.max(0, well.lowestLevel - (z[Math.floor(cell / columns)] as number)),
    gravity: 0,
    oneSided: true,
    cap: Number.POSITIVE_INFINITY,
    most: -weight * well.requested,
  }
}

/** What an exchange means for the pressure head of its cell; null where it cannot act. */
function termOf(balance: SectionBalance, exchange: Exchange): Term | null {
  const { d, z, columns } = balance
  const { cell, axis } = exchange
  const elevation = z[Math.floor(cell / columns)] as number
  const term = {
    exchange,
    well: -1,
    cell,
    gravity: 0,
    oneSided: false,
    cap: Number.POSITIVE_INFINITY,
    most: Number.POSITIVE_INFINITY,
  }
  const profile = d.profiles[d.profileOf[cell] as number]
  const k = ((axis === 'x' ? profile?.kx[0] : profile?.ky[0]) ?? 0) as number
  const half = exchange.face < 0 ? Number.POSITIVE_INFINITY : (k * exchange.width) / exchange.half
  if (!atFaceHead(exchange)) {
    const outer = exchange.conductance
    const conductance = exchange.face < 0 ? outer : (outer * half) / (outer + half)
    if (!(conductance > 0)) return null
    // A level below the cell's centre draws on it as far as there is water, no further.
    const above = exchange.head - elevation
    const level = Math.max(0, above)
    if (exchange.kind === 'drain' || above <= 0) return { ...term, conductance, level, oneSided: true }
    const cap = (outer / conductance) * (exchange.head - exchange.floor)
    return { ...term, conductance, level, cap }
  }
  const seeps = exchange.kind === 'seepage'
  if (axis === 'x') return sideTerm(d, exchange, k, elevation, term)
  const face = faceOf(d.grid, exchange.face)
  const isFoot = face.high === cell
  const above = exchange.head - (face.middle[1] - d.reference)
  // A fixed head acts where it lies over the face; water seeps at the pressure of the air.
  if (!seeps && above < -hair(d)) return null
  const pressure = Math.max(0, above)
  if (isFoot) {
    return { ...term, conductance: half, level: pressure, gravity: half * exchange.half, oneSided: seeps }
  }
  return { ...term, conductance: half, level: pressure + exchange.half, oneSided: seeps }
}

/**
 * A head at an upright face drives flow as the heads of the cell and the face say, so that water at rest stays at rest
 * where a level cuts the face. Where it lies below the cell's centre only what is under water lets water out.
 */
function sideTerm(
  d: Discretised,
  exchange: Exchange,
  k: number,
  elevation: number,
  term: Omit<Term, 'conductance' | 'level'>,
): Term | null {
  const { width, half, head } = exchange
  const { middle, length } = faceOf(d.grid, exchange.face)
  const whole = width >= length * (1 - 1e-9)
  const centre = (whole ? middle[1] : (exchange.elevation ?? middle[1])) - d.reference
  if (exchange.kind === 'seepage') {
    return {
      ...term,
      conductance: (k * width) / half,
      level: Math.max(0, centre - elevation),
      oneSided: true,
    }
  }
  const wet = Math.min(width, head - (centre - width / 2))
  if (wet <= 1e-9 * length) return null
  const above = head - elevation
  if (above > 0) return { ...term, conductance: (k * width) / half, level: above }
  // Twice as much as is wet: where the level is at the centre, the whole of it.
  return { ...term, conductance: (k * Math.min(width, 2 * wet)) / half, level: 0, oneSided: true }
}

/** Flow of a term into its cell, and -dq/dp. */
export function termFlow(term: Term, p: number): { q: number; slope: number } {
  const { conductance, level, oneSided, cap, most } = term
  const rise = level - p
  if (-conductance * rise > most) return { q: -most, slope: 0 }
  if (oneSided && rise >= 0) return { q: 0, slope: 0 }
  if (rise > cap) return { q: conductance * cap, slope: 0 }
  return { q: conductance * rise, slope: conductance }
}

/**
 * Volume stored in every cell beyond a full one at no pressure: specific yield x (theta - 1) + specific storage x p.
 * From a full cell, so that short steps lose no digits to water that stays.
 */
export function sectionStored(balance: SectionBalance, { p, theta }: SectionState): Float64Array {
  const { yields, compressed } = balance
  return yields.map(
    (full, c) => full * ((theta[c] as number) - 1) + (compressed[c] as number) * (p[c] as number),
  )
}

/** Net inflow of every cell, storage taken off. */
export function netInflow(
  balance: SectionBalance,
  { p, theta }: SectionState,
  storage: StorageTerm | null,
  out: Float64Array,
): void {
  const { d, columns, rows, east, north, fall, source, sink, terms } = balance
  out.fill(0)
  function add(cell: number, q: number): void {
    out[cell] = (out[cell] as number) + q
  }
  function between(low: number, high: number, q: number): void {
    add(low, -q)
    add(high, q)
  }
  for (let j = 0; j < rows; j++) {
    for (let i = 0; i < columns; i++) {
      const c = j * columns + i
      if (d.active[c] !== 1) continue
      const own = p[c] as number
      if (i < columns - 1) between(c, c + 1, (east[c] as number) * (own - (p[c + 1] as number)))
      if (j < rows - 1) {
        const above = c + columns
        const falls = (fall[above] as number) * (theta[above] as number)
        between(c, above, (north[c] as number) * (own - (p[above] as number)) - falls)
      }
      add(c, (source[c] as number) - (sink[c] as number) * (theta[c] as number))
    }
  }
  for (const term of terms) {
    const { q } = termFlow(term, p[term.cell] as number)
    add(term.cell, q - term.gravity * (theta[term.cell] as number))
  }
  if (!storage) return
  const stored = sectionStored(balance, { p, theta })
  for (let c = 0; c < out.length; c++) {
    add(c, ((storage.before[c] as number) - (stored[c] as number)) / storage.interval)
  }
}

/** Flow through the face between two cells, positive from its low to its high cell; 0 elsewhere. */
export function sectionFlowAtFace(balance: SectionBalance, { p, theta }: SectionState, face: number): number {
  const { columns, rows, east, north, fall } = balance
  const split = (columns + 1) * rows
  if (face < split) {
    const j = Math.floor(face / (columns + 1))
    const i = face - j * (columns + 1)
    if (i === 0 || i === columns) return 0
    const c = j * columns + i
    return (east[c - 1] as number) * ((p[c - 1] as number) - (p[c] as number))
  }
  const c = face - split
  if (c < columns || c >= columns * rows) return 0
  const below = c - columns
  const falls = (fall[c] as number) * (theta[c] as number)
  return (north[below] as number) * ((p[below] as number) - (p[c] as number)) - falls
}

/** Pressure heads and saturations; where only heads are given, those of water at rest. */
export function sectionStateOf(
  { d, columns, z }: SectionBalance,
  heads: Float64Array,
  saturation: Float64Array | null,
): SectionState {
  const p = new Float64Array(heads.length)
  const theta = new Float64Array(heads.length)
  for (let c = 0; c < heads.length; c++) {
    if (d.active[c] !== 1) continue
    const j = Math.floor(c / columns)
    const above = (heads[c] as number) - (z[j] as number)
    p[c] = Math.max(0, above)
    if (saturation) theta[c] = saturation[c] as number
    else if (above >= 0) theta[c] = 1
    else if (j > 0) theta[c] = Math.max(0, 1 + above / ((z[j] as number) - (z[j - 1] as number)))
  }
  return { p, theta }
}

import type { Discretised, Exchange } from './discretise'
import { faceBetweenColumns, faceBetweenRows } from './faces'
import { type Profile, thicknessAt, transmissivityAt } from './ground'

/**
 * What principal directions oblique to the grid add to the flow between cells, corner by corner of the grid.
 *
 * At a corner meet up to four cells and four half faces. In each cell's quarter beside the corner the flow through its
 * two half faces is taken as even, so that the drops of head from the cells' centres to the half faces are linear in
 * these flows by the inverse of the conductivity tensor. Adding the drops along each half face gives
 *
 *   D_k = sum over l of R_kl F_l,   R symmetric and positive definite,
 *
 * D_k being the drop of head across half face k between the centres (or to a boundary's head), F_l the flow through
 * half face l. R_kl with k and l at right angles is the tensor's cross term in the cell between them; walls and
 * boundary resistances stand on the diagonal; a half face that lets nothing through is left out. F = R^-1 D is the
 * multi-point flux approximation (Aavatsmark 2002, Computational Geosciences 6), the same as the mixed finite element
 * method with quadrature at the corners (Wheeler & Yotov 2006, SIAM Journal on Numerical Analysis 44). Linear heads
 * are exact, across interfaces along the grid and beside fixed heads and edges without flow too; without a cross term
 * it is the harmonic mean of the five-point balance. Every quarter's energy is positive, so the whole is positive
 * definite on any grid, for any contrast and anisotropy. Heads may leave the range of their boundaries slightly where
 * the anisotropy is strong and askew: no linear nine-point method prevents that. Faces on the model's edge at drains,
 * seepage faces, and rivers that disconnect or stand beside unconfined ground count as closed for the cross term: there
 * it is of first order.
 *
 * Kept here is the excess F - F0 over the five-point flow F0, which flow.ts computes as for any ground. Units: R is
 * time/length² for transmissivities (confined, sections), time/length for conductivities (unconfined, where D is a
 * drop of the thickness' potential).
 */
export interface Corners {
  /** How many corners have an excess. */
  count: number
  /** Entry of each grid corner, row by row with columns + 1 in a row; -1: none. */
  entryOf: Int32Array
  /** Cells around each entry's corner: south-west, south-east, north-west, north-east; -1: no ground. */
  cells: Int32Array
  /** Ten numbers an entry: the symmetric 4 x 4 excess conductance, upper triangle row by row. */
  excess: Float64Array
  /** By half face (south, north, west, east): the head of the boundary there, above the reference; NaN: none. */
  outside: Float64Array
  /** By half face: excess flow that no head changes, caused by specified flows through other half faces. */
  imposed: Float64Array
  /** Which exchanges stand at a half face of an entry (4 x entry + half face), and their shares of its flow. */
  exchangesAt: Map<number, { exchange: number; share: number }[]>
}

/** Half faces south and north of a corner are crossed along x, those to its west and east along y. */
export const lowOf = [0, 2, 0, 1] as const
export const highOf = [1, 3, 2, 3] as const
const alongX = [0, 0, 1, 1] as const
const alongY = [2, 3, 2, 3] as const

/** Place of entry (k, l), k <= l, in the upper triangle. */
export const packed = [
  [0, 1, 2, 3],
  [1, 4, 5, 6],
  [2, 5, 7, 8],
  [3, 6, 8, 9],
] as const

interface Tensor {
  xx: number
  xy: number
  yy: number
  thickness: number
}

/** The excess flows of a model, or null when all principal directions run along the axes. */
export function cornersOf(d: Discretised): Corners | null {
  const tensors = d.profiles.map((profile) => tensorOf(profile, d))
  const oblique = tensors.map(({ xy }) => xy !== 0)
  if (!oblique.includes(true)) return null
  const { grid, active, profileOf } = d
  const { columns, rows } = grid
  const outer = outerExchanges(d, tensors)
  const specified = specifiedAt(d)
  const corners: Corners = {
    count: 0,
    entryOf: new Int32Array((columns + 1) * (rows + 1)).fill(-1),
    cells: new Int32Array(0),
    excess: new Float64Array(0),
    outside: new Float64Array(0),
    imposed: new Float64Array(0),
    exchangesAt: new Map(),
  }
  const around = [0, 0, 0, 0]
  function visitOblique(visit: (vertex: number, i: number, j: number) => void): void {
    for (let j = 0; j <= rows; j++) {
      for (let i = 0; i <= columns; i++) {
        let any = false
        for (let q = 0; q < 4; q++) {
          const column = i - 1 + (q & 1)
          const row = j - 1 + (q >> 1)
          const inside = column >= 0 && column < columns && row >= 0 && row < rows
          const cell = inside ? row * columns + column : -1
          around[q] = cell >= 0 && active[cell] === 1 ? cell : -1
          if ((around[q] as number) >= 0 && oblique[profileOf[cell] as number]) any = true
        }
        if (any) visit(j * (columns + 1) + i, i, j)
      }
    }
  }
  visitOblique((vertex) => {
    corners.entryOf[vertex] = corners.count++
  })
  corners.cells = new Int32Array(4 * corners.count)
  corners.excess = new Float64Array(10 * corners.count)
  corners.outside = new Float64Array(4 * corners.count).fill(Number.NaN)
  corners.imposed = new Float64Array(4 * corners.count)
  const resistance = new Float64Array(16)
  const straight = new Float64Array(4)
  const known = new Float64Array(4)
  const open = [false, false, false, false]
  visitOblique((vertex, i, j) => {
    const entry = corners.entryOf[vertex] as number
    corners.cells.set(around, 4 * entry)
    resistance.fill(0)
    straight.fill(0)
    known.fill(0)
    const halves = halfSizes(d, i, j)
    for (let q = 0; q < 4; q++) {
      const cell = around[q] as number
      if (cell < 0) continue
      const { xx, xy, yy } = tensors[profileOf[cell] as number] as Tensor
      const det = xx * yy - xy * xy
      const lx = halves[q & 1] as number
      const ly = halves[2 + (q >> 1)] as number
      const [kx, ky] = [alongX[q] as number, alongY[q] as number]
      raise(resistance, 5 * kx, ((yy / det) * lx) / ly)
      raise(resistance, 5 * ky, ((xx / det) * ly) / lx)
      raise(resistance, 4 * kx + ky, -xy / det)
      raise(resistance, 4 * ky + kx, -xy / det)
      raise(straight, kx, lx / ly / xx)
      raise(straight, ky, ly / lx / yy)
    }
    const faces = [
      j > 0 ? faceBetweenColumns(grid, i, j - 1) : -1,
      j < rows ? faceBetweenColumns(grid, i, j) : -1,
      i > 0 ? faceBetweenRows(grid, i - 1, j) : -1,
      i < columns ? faceBetweenRows(grid, i, j) : -1,
    ]
    for (let k = 0; k < 4; k++) {
      const low = around[lowOf[k] as number] as number
      const high = around[highOf[k] as number] as number
      const face = faces[k] as number
      open[k] = false
      if (low < 0 && high < 0) continue
      if (low >= 0 && high >= 0) {
        const width = halves[k < 2 ? 2 + k : k - 2] as number
        const series = seriesResistance(d, tensors, face, low, high, straight[k] as number, width)
        if (series === Number.POSITIVE_INFINITY) continue
        open[k] = true
        raise(resistance, 5 * k, series - (straight[k] as number))
        straight[k] = series
        continue
      }
      const boundary = outer.get(face)
      if (boundary) {
        open[k] = true
        const series = 2 / boundary.conductance
        raise(resistance, 5 * k, Math.max(0, series - (straight[k] as number)))
        straight[k] = series
        corners.outside[4 * entry + k] = boundary.head
        corners.exchangesAt.set(4 * entry + k, boundary.exchanges)
      } else known[k] = 0.5 * (specified.get(face) ?? 0) * (low >= 0 ? -1 : 1)
    }
    setExcess(corners, entry, resistance, straight, known, open)
  })
  return corners
}

function raise(list: Float64Array, k: number, by: number): void {
  list[k] = (list[k] as number) + by
}

/** Half the widths west and east of a grid corner, half the heights south and north of it; 0 outside. */
function halfSizes({ grid }: Discretised, i: number, j: number): [number, number, number, number] {
  const { columns, rows, xEdges, yEdges } = grid
  const half = (edges: Float64Array, k: number) => 0.5 * ((edges[k + 1] as number) - (edges[k] as number))
  return [
    i > 0 ? half(xEdges, i - 1) : 0,
    i < columns ? half(xEdges, i) : 0,
    j > 0 ? half(yEdges, j - 1) : 0,
    j < rows ? half(yEdges, j) : 0,
  ]
}

/** Transmissivity over the full thickness (confined), or conductivity over what the highest known level wets. */
function tensorOf(profile: Profile, d: Discretised): Tensor {
  const full = profile.top[profile.top.length - 1] as number
  let level = full
  if (d.unconfined) {
    level = Math.min(full, d.highestHead)
    const base = profile.base[0] as number
    if (level <= base) level = Math.min(full, base + 1)
  }
  const thickness = thicknessAt(profile, level)
  const per = d.unconfined ? thickness : 1
  return {
    xx: transmissivityAt(profile, profile.kx, level) / per,
    xy: transmissivityAt(profile, profile.kxy, level) / per,
    yy: transmissivityAt(profile, profile.ky, level) / per,
    thickness,
  }
}

/** Half cells and wall in series, beside the share of the face that no wall covers, as the five-point balance has it. */
function seriesResistance(
  d: Discretised,
  tensors: Tensor[],
  face: number,
  low: number,
  high: number,
  open: number,
  width: number,
): number {
  const share = d.wallShare[face] as number
  if (share === 0) return open
  const a = tensors[d.profileOf[low] as number] as Tensor
  const b = tensors[d.profileOf[high] as number] as Tensor
  const per = d.unconfined ? 1 : 0.5 * (1 / a.thickness + 1 / b.thickness)
  const wall = ((d.wallResistance[face] as number) * per) / width
  return 1 / (share / (open + wall) + (1 - share) / open)
}

interface OuterBoundary {
  /** Of the whole face, from the cell's centre to the known head. */
  conductance: number
  head: number
  exchanges: { exchange: number; share: number }[]
}

/** The boundaries at outer faces whose flow is in proportion to a head: fixed heads and, confined, rivers. */
function outerExchanges(d: Discretised, tensors: Tensor[]): Map<number, OuterBoundary> {
  const found = new Map<number, { exchange: number; conductance: number; head: number }[]>()
  d.exchanges.forEach((entry, exchange) => {
    if (entry.face < 0) return
    const { xx, yy } = tensors[d.profileOf[entry.cell] as number] as Tensor
    const conductance = conductanceOf(d, entry, entry.axis === 'x' ? xx : yy)
    if (conductance === 0) return
    const others = found.get(entry.face) ?? []
    others.push({ exchange, conductance, head: entry.head })
    found.set(entry.face, others)
  })
  const boundaries = new Map<number, OuterBoundary>()
  for (const [face, list] of found) {
    const conductance = list.reduce((sum, one) => sum + one.conductance, 0)
    boundaries.set(face, {
      conductance,
      head: list.reduce((sum, one) => sum + one.conductance * one.head, 0) / conductance,
      exchanges: list.map((one) => ({ exchange: one.exchange, share: one.conductance / conductance })),
    })
  }
  return boundaries
}

/** 0 for an exchange whose flow is not in proportion to the head: it takes no part in the cross terms. */
function conductanceOf(d: Discretised, entry: Exchange, k: number): number {
  const half = (entry.width / entry.half) * k
  if (entry.kind === 'fixed') return half
  const linear = entry.kind === 'river' && entry.floor === Number.NEGATIVE_INFINITY && !d.unconfined
  return linear ? (entry.conductance * half) / (entry.conductance + half) : 0
}

function specifiedAt(d: Discretised): Map<number, number> {
  const rates = new Map<number, number>()
  for (const { face, rate } of d.specifiedFlows) if (face >= 0) rates.set(face, (rates.get(face) ?? 0) + rate)
  return rates
}

const inverse = new Float64Array(16)

/** Inverts R over the open half faces; without what the five-point balance does already. */
function setExcess(
  corners: Corners,
  entry: number,
  resistance: Float64Array,
  straight: Float64Array,
  known: Float64Array,
  open: boolean[],
): void {
  invertOpen(resistance, open)
  for (let k = 0; k < 4; k++) {
    if (!open[k]) continue
    for (let l = k; l < 4; l++) {
      if (!open[l]) continue
      const own = k === l ? 1 / (straight[k] as number) : 0
      corners.excess[10 * entry + packed[k as 0][l as 0]] = (inverse[4 * k + l] as number) - own
    }
    let imposed = 0
    for (let l = 0; l < 4; l++) {
      if (!open[l]) continue
      let drop = 0
      for (let m = 0; m < 4; m++) drop += (resistance[4 * l + m] as number) * (known[m] as number)
      imposed -= (inverse[4 * k + l] as number) * drop
    }
    corners.imposed[4 * entry + k] = imposed
  }
}

const reduced = new Float64Array(16)

/** Gauss-Jordan elimination of the open rows; R is positive definite, so no pivots are chosen. */
function invertOpen(resistance: Float64Array, open: boolean[]): void {
  reduced.set(resistance)
  inverse.fill(0)
  for (let k = 0; k < 4; k++) if (open[k]) inverse[5 * k] = 1
  for (let k = 0; k < 4; k++) {
    if (!open[k]) continue
    const pivot = reduced[5 * k] as number
    for (let m = 0; m < 4; m++) {
      reduced[4 * k + m] = (reduced[4 * k + m] as number) / pivot
      inverse[4 * k + m] = (inverse[4 * k + m] as number) / pivot
    }
    for (let l = 0; l < 4; l++) {
      if (l === k || !open[l]) continue
      const factor = reduced[4 * l + k] as number
      if (factor === 0) continue
      for (let m = 0; m < 4; m++) {
        raise(reduced, 4 * l + m, -factor * (reduced[4 * k + m] as number))
        raise(inverse, 4 * l + m, -factor * (inverse[4 * k + m] as number))
      }
    }
  }
}

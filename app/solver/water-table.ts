import type { Outcome } from './balancer'
import { atFaceHead, type Discretised, type Exchange } from './discretise'
import { faceOf } from './faces'
import { centresOf } from './grid'
import { headAt, placeOfPoint } from './points'
import type { FreeSurfacePoint, PointResult, SeepageFaceResult, Warning } from './result'

/**
 * Elevation of the free surface in every column of a vertical section, in the model's datum: NaN where nothing is
 * saturated. It is that of the lowest saturated stretch. In water at rest a cell above it is as full as the pressure
 * head under it is high, so the surface is found to much less than a cell from the cells' saturation.
 */
export function surfaceElevations(
  d: Discretised,
  heads: Float64Array,
  saturation: Float64Array,
): Float64Array {
  const { columns, rows, xEdges, yEdges } = d.grid
  const z = centresOf(yEdges)
  const elevations = new Float64Array(columns).fill(Number.NaN)
  const isWet = (c: number) => d.active[c] === 1 && (saturation[c] as number) >= 1
  const fallsAt = (c: number) => d.profiles[d.profileOf[c] as number]?.ky[0] ?? 1
  for (let i = 0; i < columns; i++) {
    let j = 0
    while (j < rows && !isWet(j * columns + i)) j++
    if (j === rows) continue
    while (j + 1 < rows && isWet((j + 1) * columns + i)) j++
    const top = j * columns + i
    let ground = j
    while (ground + 1 < rows && d.active[(ground + 1) * columns + i] === 1) ground++
    const edge = yEdges[ground + 1] as number
    if (ground === j) {
      elevations[i] = Math.min((heads[top] as number) + d.reference, edge)
      continue
    }
    // What falls through the ground above on its way down makes no surface.
    const width = (xEdges[i + 1] as number) - (xEdges[i] as number)
    let falling = (d.recharge[ground * columns + i] as number) / width
    const far = top + 3 * columns
    if (j + 3 <= ground && !isWet(far))
      falling = Math.max(falling, (saturation[far] as number) * fallsAt(far))
    let elevation = z[j] as number
    for (let k = j + 1; k <= Math.min(j + 2, ground); k++) {
      const c = k * columns + i
      if (isWet(c)) break
      const share = (saturation[c] as number) - falling / fallsAt(c)
      elevation += Math.min(1, Math.max(0, share)) * ((z[k] as number) - (z[k - 1] as number))
    }
    elevations[i] = Math.min(elevation, edge)
  }
  return elevations
}

/** The free surface as a result gives it: the columns that have one. */
export function freeSurfaceOf(
  d: Discretised,
  outcome: Outcome,
  saturation: Float64Array,
): FreeSurfacePoint[] {
  const x = centresOf(d.grid.xEdges)
  const elevations = surfaceElevations(d, outcome.heads, saturation)
  const points: FreeSurfacePoint[] = []
  for (const [i, elevation] of elevations.entries()) {
    if (!Number.isNaN(elevation)) points.push({ x: x[i] as number, elevation })
  }
  return points
}

/** How high water leaves at every seepage face, null where none does. `inflow`: into the ground, by outer face. */
export function seepageFacesOf(
  d: Discretised,
  outcome: Outcome,
  saturation: Float64Array | null,
  inflow: Map<number, number>,
): SeepageFaceResult[] {
  const elevations = saturation ? surfaceElevations(d, outcome.heads, saturation) : null
  const results: SeepageFaceResult[] = []
  for (const [index, boundary] of (d.model.boundaries ?? []).entries()) {
    if (boundary.kind !== 'seepage face') continue
    const faces = d.exchanges.filter((exchange) => exchange.index === index && exchange.kind === 'seepage')
    const most = Math.max(0, ...faces.map(({ face }) => -(inflow.get(face) ?? 0)))
    const wet = faces.filter(({ face }) => -(inflow.get(face) ?? 0) > 1e-9 * most)
    const highest = wet.reduce<Exchange | null>(
      (best, one) => (best && best.head >= one.head ? best : one),
      null,
    )
    results.push({
      name: boundary.name,
      exitElevation: highest === null ? null : exitAt(d, highest, elevations),
    })
  }
  return results
}

/**
 * At an upright face the surface is carried on from the two columns beside it, at most one cell from the highest face
 * that gives water; elsewhere the exit is where that face is.
 */
function exitAt(d: Discretised, exchange: Exchange, elevations: Float64Array | null): number {
  const { columns, xEdges } = d.grid
  const face = faceOf(d.grid, exchange.face)
  const place = exchange.head + d.reference
  if (face.axis === 'y' || !elevations) return place
  const i = exchange.cell % columns
  const inward = face.low === exchange.cell ? i - 1 : i + 1
  const x = centresOf(xEdges)
  const [near, far] = [elevations[i] as number, elevations[inward] ?? Number.NaN]
  if (Number.isNaN(near)) return place
  const [xNear, xFar] = [x[i] as number, x[inward] as number]
  const carried = Number.isNaN(far) ? near : near + ((near - far) * (face.middle[0] - xNear)) / (xNear - xFar)
  const low = face.middle[1] - 1.5 * face.length
  const high = face.middle[1] + 1.5 * face.length
  return Math.min(high, Math.max(low, carried))
}

/**
 * Heads to interpolate between, above the reference: above the free surface the pressure is carried on upwards as it
 * falls below it, NaN in columns without one, so that a place is above the surface where its pressure is negative.
 */
export function carriedHeads(d: Discretised, heads: Float64Array, saturation: Float64Array): Float64Array {
  const { columns, rows, yEdges } = d.grid
  const z = centresOf(yEdges)
  const elevations = surfaceElevations(d, heads, saturation)
  const carried = heads.slice()
  for (let i = 0; i < columns; i++) {
    let slope = 1
    let belowIsWet = false
    for (let j = 0; j < rows; j++) {
      const c = j * columns + i
      if (d.active[c] !== 1) continue
      if ((saturation[c] as number) >= 1) {
        belowIsWet = true
        const above = (elevations[i] as number) - (z[j] as number)
        const p = (heads[c] as number) + d.reference - (z[j] as number)
        slope = above > 0 && p > 0 ? Math.min(1, p / above) : 1
        continue
      }
      carried[c] = belowIsWet
        ? (z[j] as number) + slope * ((elevations[i] as number) - (z[j] as number)) - d.reference
        : Number.NaN
    }
  }
  return carried
}

/** Heads at the points of a section with a free surface; null, with the reason, above it. */
export function sectionPoints(
  d: Discretised,
  { flow, heads }: Outcome,
  saturation: Float64Array,
  inflow: Map<number, number>,
): PointResult[] {
  const carried = carriedHeads(d, heads, saturation)
  const height = (d.grid.yEdges[d.grid.rows] as number) - (d.grid.yEdges[0] as number)
  return (d.model.points ?? []).map((point, index) => {
    const [x, y] = placeOfPoint(d, point, `points[${index}]`)
    const head = headAt(flow, carried, inflow, x, y)
    const none = (why: string): PointResult => ({ name: point.name, head: [null], why })
    if (head === 'no ground') return none('there is no ground here')
    if (head === 'hidden') return none('there is no cell centre on this side of the walls')
    if (head === 'dry' || !(head + d.reference - y >= -1e-9 * height)) return none('above the water table')
    return { name: point.name, head: [head + d.reference] }
  })
}

/** What a result with a free surface leaves out, and where water stands above the ground. */
export function freeSurfaceWarnings(d: Discretised, outcome: Outcome, saturation: Float64Array): Warning[] {
  const warnings: Warning[] = [
    {
      code: 'no-capillarity',
      severity: 'note',
      text: 'Above the free surface water only falls: the unsaturated zone and capillarity are left out.',
    },
  ]
  const { columns, rows, xEdges, yEdges } = d.grid
  const open = new Set(d.exchanges.filter(atFaceHead).map(({ cell }) => cell))
  const flooded: number[] = []
  for (let i = 0; i < columns; i++) {
    let j = rows - 1
    while (j >= 0 && d.active[j * columns + i] !== 1) j--
    const c = j * columns + i
    if (j < 0 || open.has(c) || (d.fixedBy[c] as number) >= 0 || (saturation[c] as number) < 1) continue
    const edge = yEdges[j + 1] as number
    if ((outcome.heads[c] as number) + d.reference > edge + 1e-6 * (edge - (yEdges[0] as number)))
      flooded.push(i)
  }
  if (flooded.length > 0) {
    const first =
      ((xEdges[flooded[0] as number] as number) + (xEdges[(flooded[0] as number) + 1] as number)) / 2
    warnings.push({
      code: 'head-above-ground',
      severity: 'check',
      text: `The head stands above the ground in ${flooded.length} ${flooded.length === 1 ? 'column' : 'columns'} that have no outlet there, first at x = ${first}: a seepage face would let the water out.`,
    })
  }
  return warnings
}

/** Saturated sections count every cell as full: where the pressure is negative that is doubtful. */
export function suctionWarnings(d: Discretised, { heads }: Outcome): Warning[] {
  const { columns, yEdges, rows } = d.grid
  const z = centresOf(yEdges)
  const hair = 1e-9 * ((yEdges[rows] as number) - (yEdges[0] as number))
  let cells = 0
  for (let c = 0; c < heads.length; c++) {
    if (d.active[c] !== 1) continue
    if ((heads[c] as number) + d.reference < (z[Math.floor(c / columns)] as number) - hair) cells++
  }
  if (cells === 0) return []
  return [
    {
      code: 'negative-pressure',
      severity: 'check',
      text: `The pressure is negative in ${cells} ${cells === 1 ? 'cell' : 'cells'}: saturated flow counts them as full of water. Flow with a free surface does not.`,
    },
  ]
}

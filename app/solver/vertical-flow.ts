import type { Discretised, Exchange } from './discretise'
import { faceBetweenColumns, faceBetweenRows, faceOf } from './faces'
import type { FlowModel } from './flow'
import { centresOf } from './grid'
import { type Profile, thicknessAt, transmissivityAt } from './ground'
import { linePieces } from './line-on-grid'
import type { Model } from './model'
import { ModelError, requireFinite } from './model-error'
import type { Report } from './record'
import type { Warning } from './result'
import { cellHeadOf, mainCell, wellHeadOf } from './well-heads'

/**
 * Plan flow takes flow as horizontal. These are the places where a result in plan leans on that and vertical flow would
 * change it; a result with such a warning is issued only once somebody has accepted it. The limits are set so that a
 * warning means a change of several percent of the saturated thickness, or of a drawdown.
 */

/**
 * Slope of the water table, head lost for each unit of length, above which Dupuit's assumption is left: it neglects
 * the square of the slope against 1 (Bear 1972), here 4 %.
 */
export const steepestWaterTable = 0.2

/** The slope is taken over this many times the greatest saturated thickness: a shorter steep stretch evens out. */
export const steepOverThicknesses = 2

/**
 * Vertical flow caused by a well or an edge that is open over part of the depth has died away beyond this many
 * saturated thicknesses, times sqrt(Kh / Kv) (Hantush 1964).
 */
export const reachInThicknesses = 1.5

/**
 * A screen over this share of the saturated thickness counts as whole: what it adds to the drawdown at the well face,
 * about (1 - share) / share of the part lost within one thickness, is then about a tenth (common practice, no source).
 */
export const wholeScreen = 0.85

/** With less than this share of the thickness still wet, water leaves above the level it is drawn to (no source). */
export const leastWetShare = 0.05

/** Head lost within one thickness of the edge of a dig or of water, as a share of that thickness (no source). */
export const greatestEdgeJump = 0.5

const sectionAnswers = 'A vertical section through it answers this.'

/** Refuses toes and screens that contradict themselves, or stand in a vertical section. */
export function checkVerticalExtents(model: Model): void {
  const inSection = 'belongs to a plan; a vertical section shows how deep it reaches'
  model.walls?.forEach(({ toe }, index) => {
    const path = `walls[${index}].toe`
    if (toe === undefined) return
    requireFinite(toe, path)
    if (model.kind === 'section') throw new ModelError(path, inSection)
  })
  model.wells?.forEach(({ screen }, index) => {
    const path = `wells[${index}].screen`
    if (screen === undefined) return
    requireFinite(screen.top, `${path}.top`)
    requireFinite(screen.bottom, `${path}.bottom`)
    if (model.kind === 'section') throw new ModelError(path, inSection)
    if (screen.bottom >= screen.top) {
      throw new ModelError(path, `its bottom ${screen.bottom} is not below its top ${screen.top}`)
    }
  })
}

/** What vertical flow would change in a result in plan; each thing once, at the reported time when it is greatest. */
export function verticalFlowWarnings(reports: readonly Report[]): Warning[] {
  if (reports[0]?.d.model.kind !== 'plan') return []
  const worst = new Map<string, Found>()
  for (const report of reports) {
    const state = stateOf(report)
    for (const found of [
      ...hangingWalls(state),
      ...partScreens(state),
      ...steepWaterTable(state),
      ...drawnToTheBase(state),
      ...steepEdges(state),
    ]) {
      const key = `${found.code} ${found.what}`
      const before = worst.get(key)
      if (!before || found.size > before.size) worst.set(key, found)
    }
  }
  return [...worst.values()].map(({ code, text }) => ({ code, severity: 'check', text, accept: true }))
}

interface Found {
  code: string
  /** The row or place it is about: the worst of them in time is told. */
  what: string
  size: number
  text: string
}

/**
 * One reported moment, with the saturated thickness of every cell: 0 where there is no ground or it is dry. Nobody asks
 * for it, and it stays 0, in confined ground without a dig or water in it.
 */
interface State {
  report: Report
  d: Discretised
  flow: FlowModel
  heads: Float64Array
  thickness: Float64Array
  greatest: number
  x: Float64Array
  y: Float64Array
  /** ' at time 30' in transient flow. */
  when: string
}

function stateOf(report: Report): State {
  const { d, outcome, time } = report
  const { flow, heads } = outcome
  const thickness = new Float64Array(heads.length)
  let greatest = 0
  const asked = d.unconfined || holdsPolygons(d) || d.exchanges.some((exchange) => standsInAHole(d, exchange))
  for (let cell = 0; asked && cell < heads.length; cell++) {
    if (d.active[cell] !== 1) continue
    const profile = profileAt(d, cell)
    const h = d.unconfined ? (heads[cell] as number) : topOf(profile)
    const wet = thicknessAt(profile, h)
    if (wet <= 2 * flow.film) continue
    thickness[cell] = wet
    greatest = Math.max(greatest, wet)
  }
  return {
    report,
    d,
    flow,
    heads,
    thickness,
    greatest,
    x: centresOf(d.grid.xEdges),
    y: centresOf(d.grid.yEdges),
    when: d.model.time.kind === 'transient' ? ` at time ${time} ${d.model.units.time}` : '',
  }
}

function profileAt(d: Discretised, cell: number): Profile {
  return d.profiles[d.profileOf[cell] as number] as Profile
}

function topOf(profile: Profile): number {
  return profile.top[profile.top.length - 1] as number
}

/** Three figures. */
function short(value: number): string {
  return String(Number(value.toPrecision(3)))
}

function percent(share: number): string {
  return `${Number((100 * share).toPrecision(2))} %`
}

// ---- Walls that hang -------------------------------------------------------------------------------------------

function hangingWalls({ d, heads }: State): Found[] {
  const found: Found[] = []
  const unit = d.model.units.length
  for (const wall of d.model.walls ?? []) {
    if (wall.toe === undefined) continue
    const toe = wall.toe - d.reference
    let gap = 0
    let open = 0
    for (const piece of linePieces(d.grid, wall.line)) {
      for (const cell of cellsBeside(d, piece.cell, piece.face)) {
        const profile = profileAt(d, cell)
        const h = d.unconfined ? (heads[cell] as number) : topOf(profile)
        const base = profile.base[0] as number
        if (toe - base <= 1e-6 * Math.max(thicknessAt(profile, h), 1e-3)) continue
        gap = Math.max(gap, toe - base)
        const whole = transmissivityAt(profile, profile.kx, h)
        if (whole > 0) open = Math.max(open, transmissivityAt(profile, profile.kx, Math.min(toe, h)) / whole)
      }
    }
    if (gap === 0) continue
    found.push({
      code: 'hanging-wall',
      what: wall.name,
      size: gap,
      text: `The wall "${wall.name}" ends at ${wall.toe} ${unit}, up to ${short(gap)} ${unit} above the base of the ground: ${percent(open)} of what the ground transmits lies under its toe. Plan flow closes it to the base, so that the flow under the toe and the heads it raises behind the wall are left out. ${sectionAnswers}`,
    })
  }
  return found
}

function cellsBeside(d: Discretised, cell: number, face: number): number[] {
  if (face < 0) return cell >= 0 && d.active[cell] === 1 ? [cell] : []
  const { low, high } = faceOf(d.grid, face)
  return [low, high].filter((one) => one >= 0 && d.active[one] === 1)
}

// ---- Wells open over part of the depth -------------------------------------------------------------------------

function partScreens(state: State): Found[] {
  const { d, report, when } = state
  const unit = d.model.units.length
  const found: Found[] = []
  d.wells.forEach((well, index) => {
    const screen = d.model.wells?.[index]?.screen
    if (!screen || (report.outcome.rates[index] as number) === 0) return
    const profile = profileAt(d, mainCell(well))
    const h = d.unconfined ? cellHeadOf(well, state.heads) : topOf(profile)
    const wet = thicknessAt(profile, h)
    const base = profile.base[0] as number
    const top = Math.min(screen.top - d.reference, h, topOf(profile))
    const open = Math.max(0, top - Math.max(screen.bottom - d.reference, base))
    if (wet <= 0 || open >= wholeScreen * wet) return
    const reach = reachInThicknesses * wet * rootOfAnisotropy(profile, h)
    const near = (d.model.points ?? [])
      .filter((point) => Math.hypot(point.x - well.x, point.y - well.y) <= reach)
      .map(({ name }) => `"${name}"`)
    // Without a head at its face and a point nearby, no result feels which part of the ground the well is open to.
    if (well.radius === 0 && near.length === 0) return
    const results = [
      ...(well.radius > 0 ? ['the head at the well face'] : []),
      ...(near.length > 0
        ? [`the head at ${near.slice(0, 5).join(', ')}${near.length > 5 ? ' …' : ''}`]
        : []),
    ]
    found.push({
      code: 'part-screen',
      what: well.name,
      size: wet - open,
      text: `The well "${well.name}" is open over ${short(open)} of ${short(wet)} ${unit} of saturated thickness${when} (${percent(open / wet)}). Within about ${short(reach)} ${unit} of it the flow is not horizontal, and the well moves heads by more than plan flow says: ${results.join(' and ')} would differ. ${sectionAnswers}`,
    })
  })
  return found
}

/** sqrt(Kh / Kv) of the wet layers together, each taken as equally conductive in all directions. */
function rootOfAnisotropy(profile: Profile, h: number): number {
  let wet = 0
  let along = 0
  let across = 0
  profile.kx.forEach((kx, layer) => {
    const base = profile.base[layer] as number
    const part = Math.min(h, profile.top[layer] as number) - base
    if (part <= 0) return
    const k = Math.sqrt(kx * (profile.ky[layer] as number))
    wet += part
    along += part * k
    across += part / k
  })
  return wet > 0 ? Math.sqrt((along / wet) * (across / wet)) : 1
}

// ---- A steep water table ---------------------------------------------------------------------------------------

function steepWaterTable(state: State): Found[] {
  const { d, heads, greatest, when } = state
  if (!d.unconfined || greatest === 0) return []
  const square = new Float64Array(heads.length)
  const left = leftOut(state)
  const over = steepOverThicknesses * greatest
  slopesAlong(state, 'x', left, over, square)
  slopesAlong(state, 'y', left, over, square)
  let worst = -1
  let steep = 0
  let all = 0
  for (let cell = 0; cell < heads.length; cell++) {
    if (d.active[cell] !== 1) continue
    all++
    if ((square[cell] as number) <= steepestWaterTable ** 2) continue
    steep++
    if (worst < 0 || (square[cell] as number) > (square[worst] as number)) worst = cell
  }
  if (worst < 0) return []
  const slope = Math.sqrt(square[worst] as number)
  return [
    {
      code: 'steep-water-table',
      what: '',
      size: slope,
      text: `The water table falls by 1 in ${short(1 / slope)} near (${placeOf(state, worst)})${when}, away from wells, and by more than 1 in ${1 / steepestWaterTable} from ${percent(steep / all)} of the cells. Dupuit's assumption of horizontal flow neglects the square of the slope, ${percent(slope * slope)} there: heads would differ by about that share of the saturated thickness, and water would leave above the level outside. ${sectionAnswers}`,
    },
  ]
}

function placeOf({ d, x, y }: State, cell: number): string {
  const row = Math.floor(cell / d.grid.columns)
  return `${short(x[cell - row * d.grid.columns] as number)}, ${short(y[row] as number)}`
}

/** Cells where the slope of the water table says nothing about Dupuit: dry, or within reach of a well that runs. */
function leftOut(state: State): Uint8Array {
  const { d, report, thickness, greatest, x, y } = state
  const left = new Uint8Array(thickness.length)
  for (let cell = 0; cell < left.length; cell++) if (thickness[cell] === 0) left[cell] = 1
  d.wells.forEach((well, index) => {
    if ((report.outcome.rates[index] as number) === 0) return
    const profile = profileAt(d, mainCell(well))
    const reach = reachInThicknesses * greatest * rootOfAnisotropy(profile, d.highestHead)
    for (let j = 0; j < d.grid.rows; j++) {
      const across = (y[j] as number) - well.y
      if (Math.abs(across) > reach) continue
      for (let i = 0; i < d.grid.columns; i++) {
        if (Math.hypot((x[i] as number) - well.x, across) <= reach) left[j * d.grid.columns + i] = 1
      }
    }
  })
  return left
}

/**
 * Adds to `square`, at the cell where it starts, the square of the slope along one axis over the length `over`.
 * Stretches without a wall, a well or a gap in them; those between two edges or held heads that lie closer together
 * than that are taken whole.
 */
function slopesAlong(state: State, axis: 'x' | 'y', left: Uint8Array, over: number, square: Float64Array) {
  const { d, heads } = state
  const { columns, rows } = d.grid
  const [lines, count] = axis === 'x' ? [rows, columns] : [columns, rows]
  const centres = axis === 'x' ? state.x : state.y
  const held = (cell: number) => (d.fixedBy[cell] as number) >= 0
  for (let line = 0; line < lines; line++) {
    const cellOf = (k: number) => (axis === 'x' ? line * columns + k : k * columns + line)
    const isGround = (k: number) => k >= 0 && k < count && d.active[cellOf(k)] === 1
    const isWalled = (k: number) => {
      const face = axis === 'x' ? faceBetweenColumns(d.grid, k, line) : faceBetweenRows(d.grid, line, k)
      return (d.wallShare[face] as number) > 0
    }
    let first = 0
    while (first < count) {
      if (!isGround(first) || left[cellOf(first)] === 1) {
        first++
        continue
      }
      let last = first
      while (isGround(last + 1) && left[cellOf(last + 1)] === 0 && !isWalled(last + 1)) {
        last++
        if (held(cellOf(last))) break
      }
      const length = (centres[last] as number) - (centres[first] as number)
      const atEdges =
        (!isGround(first - 1) || held(cellOf(first))) && (!isGround(last + 1) || held(cellOf(last)))
      // Two held cells side by side say nothing of the ground.
      if (atEdges && last - first < 2) {
        first = last + 1
        continue
      }
      const stretch = atEdges ? Math.min(over, length) : over
      let end = first
      for (let start = first; start < last && length > 0; start++) {
        while (end < last && (centres[end] as number) - (centres[start] as number) < stretch * (1 - 1e-9))
          end++
        const reached = (centres[end] as number) - (centres[start] as number)
        if (reached < stretch * (1 - 1e-9)) break
        const fall = (heads[cellOf(end)] as number) - (heads[cellOf(start)] as number)
        square[cellOf(start)] = (square[cellOf(start)] as number) + (fall / reached) ** 2
      }
      first = last > first && held(cellOf(last)) && isGround(last + 1) ? last : last + 1
    }
  }
}

// ---- Water drawn down to the base ------------------------------------------------------------------------------

function drawnToTheBase(state: State): Found[] {
  const { d, report, flow, heads, when } = state
  if (!d.unconfined) return []
  const found: Found[] = []
  const tell = (what: string, wet: number, thickness: number, reach: number) => {
    const share = Math.max(0, wet) / thickness
    if (share >= leastWetShare) return
    found.push({
      code: 'drawn-to-the-base',
      what,
      size: 1 - share,
      text: `${what} draws the water table${when} down to the lowest ${percent(Math.max(share, 0.001))} of the ground there. In truth water seeps out above the level it is drawn to, and flow is not horizontal within about ${short(reach)} ${d.model.units.length} of it: heads there stand higher than plan flow says. ${sectionAnswers}`,
    })
  }
  d.wells.forEach((well, index) => {
    const rate = report.outcome.rates[index] as number
    if (rate >= 0) return
    const profile = profileAt(d, mainCell(well))
    const thickness = wholeThickness(d, profile)
    const base = profile.base[0] as number
    const level = well.radius > 0 ? (wellHeadOf(flow, well, rate, heads) ?? base) : cellHeadOf(well, heads)
    tell(`The well "${well.name}"`, level - base, thickness, reachInThicknesses * thickness)
  })
  const drains = new Map<string, { wet: number; thickness: number }>()
  for (const { kind, cell, index, head } of d.exchanges) {
    if (kind !== 'drain' || (heads[cell] as number) <= head) continue
    const profile = profileAt(d, cell)
    const thickness = wholeThickness(d, profile)
    const wet = (heads[cell] as number) - (profile.base[0] as number)
    const name = d.model.boundaries?.[index]?.name ?? ''
    const before = drains.get(name)
    if (!before || wet / thickness < before.wet / before.thickness) drains.set(name, { wet, thickness })
  }
  for (const [name, { wet, thickness }] of drains) {
    tell(`The drain "${name}"`, wet, thickness, reachInThicknesses * thickness)
  }
  return found
}

/** Saturated thickness at the highest level known outside. */
function wholeThickness(d: Discretised, profile: Profile): number {
  return Math.max(thicknessAt(profile, d.highestHead), 1e-9)
}

// ---- Digs and water whose edge the head jumps at ---------------------------------------------------------------

/**
 * Edges of held polygons and of holes where the head changes, within one saturated thickness, by a good part of that
 * thickness; in confined ground where it is held below the top, so that the ground drains there.
 */
function steepEdges(state: State): Found[] {
  const { d, when } = state
  const worst = new Map<number, { share: number; jump: number; cell: number }>()
  const look = (boundary: number, face: number, cell: number, level: number) => {
    // Held over its whole depth at a level above its top, confined ground has horizontal flow however steep.
    if (!d.unconfined && level >= topOf(profileAt(d, cell))) return
    const seen = withinOneThickness(state, face, cell, level)
    if (!seen || seen.share <= Math.max(greatestEdgeJump, worst.get(boundary)?.share ?? 0)) return
    worst.set(boundary, seen)
  }
  for (const { face, cell, from } of edgesOfHeldPolygons(d)) {
    look(d.fixedBy[from] as number, face, cell, d.fixedHead[from] as number)
  }
  for (const exchange of d.exchanges) {
    if (exchange.owner === 'boundaries' && standsInAHole(d, exchange))
      look(exchange.index, exchange.face, exchange.cell, exchange.head)
  }
  return [...worst].map(([index, { share, jump, cell }]) => {
    const name = d.model.boundaries?.[index]?.name ?? ''
    return {
      code: 'steep-edge',
      what: name,
      size: share,
      text: `Beside "${name}", near (${placeOf(state, cell)}), the head changes by ${short(jump)} ${d.model.units.length}${when} within one saturated thickness, ${percent(share)} of it. Flow there rises or falls steeply towards the edge: plan flow has the heads within about ${reachInThicknesses} thicknesses of it wrong, and says nothing of gradients through the floor. ${sectionAnswers}`,
    }
  })
}

function holdsPolygons({ model }: Discretised): boolean {
  return (model.boundaries ?? []).some(({ kind, polygon }) => kind === 'fixed head' && polygon !== undefined)
}

/** Faces between a cell held by a polygon and a free cell of the ground, without a wall. */
function edgesOfHeldPolygons(d: Discretised): { face: number; cell: number; from: number }[] {
  const found: { face: number; cell: number; from: number }[] = []
  if (!holdsPolygons(d)) return found
  const { columns, rows } = d.grid
  const byPolygon = (cell: number) => {
    const by = d.fixedBy[cell] as number
    return by >= 0 && d.model.boundaries?.[by]?.polygon !== undefined
  }
  const visit = (face: number, one: number, other: number) => {
    if (d.active[one] !== 1 || d.active[other] !== 1 || (d.wallShare[face] as number) > 0) return
    if (byPolygon(one) && (d.fixedBy[other] as number) < 0) found.push({ face, cell: other, from: one })
    if (byPolygon(other) && (d.fixedBy[one] as number) < 0) found.push({ face, cell: one, from: other })
  }
  for (let j = 0; j < rows; j++) {
    for (let i = 0; i < columns; i++) {
      const cell = j * columns + i
      if (i > 0) visit(faceBetweenColumns(d.grid, i, j), cell - 1, cell)
      if (j > 0) visit(faceBetweenRows(d.grid, i, j), cell - columns, cell)
    }
  }
  return found
}

function standsInAHole(d: Discretised, { kind, face }: Exchange): boolean {
  if (face < 0 || (kind !== 'fixed' && kind !== 'drain')) return false
  const { low, high } = faceOf(d.grid, face)
  return low >= 0 && high >= 0
}

/** From a face into the ground beside it, until one saturated thickness away; null where something stands between. */
function withinOneThickness(
  { d, heads, thickness, x, y }: State,
  face: number,
  cell: number,
  level: number,
): { share: number; jump: number; cell: number } | null {
  const { columns, rows } = d.grid
  const { axis, low, middle } = faceOf(d.grid, face)
  const step = low === cell ? -1 : 1
  const row = Math.floor(cell / columns)
  const line = axis === 'x' ? row : cell - row * columns
  const [centres, count, from] = axis === 'x' ? [x, columns, middle[0]] : [y, rows, middle[1]]
  const cellOf = (k: number) => (axis === 'x' ? line * columns + k : k * columns + line)
  for (let k = axis === 'x' ? cell - row * columns : row; k >= 0 && k < count; k += step) {
    const here = cellOf(k)
    const wet = thickness[here] as number
    if (wet === 0) return null
    if (Math.abs((centres[k] as number) - from) >= wet) {
      const jump = Math.abs((heads[here] as number) - level)
      return { share: jump / wet, jump, cell: here }
    }
    const beyond = k + (step > 0 ? 1 : 0)
    const next =
      axis === 'x' ? faceBetweenColumns(d.grid, beyond, line) : faceBetweenRows(d.grid, line, beyond)
    if ((d.wallShare[next] as number) > 0) return null
  }
  return null
}

import { type Corners, cornersOf } from './corners'
import { columnFaceCount, faceCount, faceOf } from './faces'
import { cellAt, type Grid, gridOf } from './grid'
import { groundOnGrid, type Profile, shiftLevels, thicknessAt, transmissivityAt } from './ground'
import {
  type Along,
  checkLine,
  crossedFaces,
  lineLength,
  linePieces,
  placeLine,
  valueAlong,
} from './line-on-grid'
import type { Boundary, Model, Position, Value, Wall } from './model'
import { ModelError, requireFinite, requireNotNegative, requirePositive } from './model-error'
import { plannedGrid } from './planned-grid'
import { checkedPolygon, signedArea, visitCellsInside, visitOverlaps } from './polygon'
import type { Warning } from './result'
import { refuseWhatIsNotComputed } from './scope'
import { knownLevels, modelOfStage } from './stages'
import { closeTips, type TipGround, tipsOf } from './wall-tips'
import { type PlacedWell, placeWells } from './wells'

/** Water exchanged with something outside the ground at a known level, in one cell or through one outer face of it. */
export interface Exchange {
  /**
   * 'fixed': the head stands at the face. 'river': conductance x (head - h). 'drain': the same, outflow only.
   * 'seepage': the head stands at the face, which is the elevation of the face, while water flows out.
   */
  kind: 'fixed' | 'river' | 'drain' | 'seepage'
  owner: 'boundaries' | 'leakage'
  index: number
  cell: number
  /** The outer face it acts at, or -1 for the cell itself. */
  face: number
  axis: 'x' | 'y'
  /** Covered length of the face, and from the cell's centre to it. */
  width: number
  half: number
  /** Area per time; infinite for 'fixed' and 'seepage'. */
  conductance: number
  head: number
  /** Inflow stops growing when the level beside it falls below this. */
  floor: number
  /** At a face: y of the middle of what the line covers. */
  elevation?: number
}

/** Specified flow into a cell (volume/time) by one boundary, through `face` or, -1, into the cell itself. */
export interface SpecifiedFlow {
  index: number
  cell: number
  face: number
  width: number
  rate: number
}

/**
 * The model on its grid, ready to be solved. All heads and levels are above `reference`, so that the datum changes
 * nothing. Arrays by cell have columns x rows entries, arrays by face as faces.ts numbers them. Rates are volume/time.
 */
export interface Discretised {
  model: Model
  grid: Grid
  active: Uint8Array
  profileOf: Int32Array
  profiles: Profile[]
  unconfined: boolean
  reference: number
  /** Spread of the known levels outside; 0 when they are all the same. */
  headRange: number
  /** The highest known level outside. */
  highestHead: number
  /** Head of cells held at one, NaN elsewhere, and the boundary that holds them, -1 elsewhere. */
  fixedHead: Float64Array
  fixedBy: Int32Array
  /** Share of each face that a wall covers, and the wall's thickness / k there (infinite: impermeable). */
  wallShare: Float64Array
  wallResistance: Float64Array
  /** Confined: conductance of each face between two active cells, 0 elsewhere. Unconfined: empty. */
  conductance: Float64Array
  /** What directions of conductivity oblique to the grid add; null: none are. */
  corners: Corners | null
  exchanges: Exchange[]
  specifiedFlows: SpecifiedFlow[]
  /** Recharge into each cell, and into the whole model by entry. */
  recharge: Float64Array
  rechargeByEntry: number[]
  wells: PlacedWell[]
  warnings: Warning[]
}

/**
 * Lays a model out on its grid, as it stands in one stage (steady models have one). Every stage measures its heads
 * from the same reference, amid `levels`. Throws ModelError, with the path in the file, for all that cannot be computed.
 */
export function discretise(file: Model, stage = 0, levels = knownLevels(file)): Discretised {
  refuseWhatIsNotComputed(file)
  const model = modelOfStage(file, stage)
  const warnings: Warning[] = []
  const grid = 'cellSize' in model.grid ? plannedGrid(model, model.grid, warnings) : gridOf(model, model.grid)
  const { active, profileOf, profiles } = groundOnGrid(model, grid)
  const count = grid.columns * grid.rows
  const discretised: Discretised = {
    model,
    grid,
    active,
    profileOf,
    profiles,
    unconfined: model.flow === 'unconfined',
    reference: 0,
    headRange: 0,
    highestHead: 0,
    fixedHead: new Float64Array(count).fill(Number.NaN),
    fixedBy: new Int32Array(count).fill(-1),
    wallShare: new Float64Array(faceCount(grid)),
    wallResistance: new Float64Array(faceCount(grid)),
    conductance: new Float64Array(0),
    corners: null,
    exchanges: [],
    specifiedFlows: [],
    recharge: new Float64Array(count),
    rechargeByEntry: [],
    wells: [],
    warnings,
  }
  placeBoundaries(discretised)
  placeWalls(discretised)
  placeLeakage(discretised)
  placeRecharge(discretised)
  discretised.wells = placeWells(model, grid, active, discretised.wallShare, warnings)
  subtractReference(discretised, levels)
  // Storage ties the heads of every cell to those before.
  if (model.time.kind === 'steady') refuseWithoutReference(discretised)
  if (!discretised.unconfined) discretised.conductance = confinedConductances(discretised)
  discretised.corners = cornersOf(discretised)
  return discretised
}

/** The row's name, or its number when it has none, for messages. */
function called(row: { name?: string }, index: number): string {
  return row.name ? `"${row.name}"` : `no. ${index + 1}`
}

function placeWalls(d: Discretised): void {
  const { model, grid, active, wallShare, wallResistance, warnings } = d
  const walls = model.walls ?? []
  const by = new Int32Array(wallShare.length).fill(-1)
  const overlaps = new Set<string>()
  const ground = tipGroundOf(d)
  for (const [index, wall] of walls.entries()) {
    const path = `walls[${index}]`
    checkLine(wall.line, `${path}.line`)
    const thickness = requirePositive(wall.thickness, `${path}.thickness`)
    const k = requireNotNegative(wall.k, `${path}.k`)
    const free = freeEnds(d, walls, index)
    const tips = tipsOf(wall, free, ground)
    const inGround = lengthInGround(grid, active, tips.line)
    const separated = crossedFaces(grid, tips.line, free).filter(({ face }) => {
      const { low, high } = faceOf(grid, face)
      return low >= 0 && high >= 0 && active[low] === 1 && active[high] === 1
    })
    // A staircase is longer than the wall it follows, so each face carries that much more resistance.
    const stairs = new Float64Array(wall.line.length)
    for (const { face, share, at } of separated) {
      stairs[at.segment] = (stairs[at.segment] as number) + share * faceOf(grid, face).length
    }
    const faces = closeTips(wall, tips, ground, separated)
    if (faces.length === 0) {
      warnings.push({
        code: 'wall-not-represented',
        severity: 'check',
        text: `The wall ${called(wall, index)} separates no two cell centres: it is shorter than the cells or outside the ground, and has no effect.`,
      })
      continue
    }
    for (const { face, share, at } of faces) {
      const straight = inGround[at.segment] as number
      const correction = straight > 0 ? (stairs[at.segment] as number) / straight : 1
      const resistance = k === 0 ? Number.POSITIVE_INFINITY : (thickness / k) * correction
      const before = by[face] as number
      if (before >= 0) {
        overlaps.add(`${called(walls[before] as Wall, before)} and ${called(wall, index)}`)
        // Where walls cross or share faces the more resistant one counts: the other would be a leak in it.
        if ((wallResistance[face] as number) > resistance) continue
      }
      by[face] = index
      wallShare[face] = Math.max(share, wallShare[face] as number)
      wallResistance[face] = resistance
    }
  }
  for (const pair of overlaps) {
    warnings.push({
      code: 'walls-share-faces',
      severity: 'note',
      text: `The walls ${pair} share cell faces; the more resistant one counts there.`,
    })
  }
  if (model.kind === 'plan' && walls.some(({ toe }) => toe === undefined)) {
    warnings.push({
      code: 'wall-full-depth',
      severity: 'note',
      text: 'In plan a wall acts over the whole saturated thickness. One that ends above the base needs a vertical section.',
    })
  }
}

function tipGroundOf({ grid, active, fixedBy, profileOf, profiles }: Discretised): TipGround {
  return {
    grid,
    isGround: (x, y) => {
      const cell = cellAt(grid, x, y)
      return cell >= 0 && active[cell] === 1
    },
    isFree: (x, y) => {
      const cell = cellAt(grid, x, y)
      return cell >= 0 && active[cell] === 1 && (fixedBy[cell] as number) < 0
    },
    conductivity: (x, y) => {
      const profile = profiles[profileOf[cellAt(grid, x, y)] as number] as Profile
      const thick = (layer: number) => {
        const thickness = (profile.top[layer] as number) - (profile.base[layer] as number)
        return Number.isFinite(thickness) ? thickness : 1
      }
      const sum = (k: number[]) => k.reduce((total, value, layer) => total + value * thick(layer), 0)
      return { x: sum(profile.kx), y: sum(profile.ky) }
    },
  }
}

function lengthInGround(grid: Grid, active: Uint8Array, line: Position[]): Float64Array {
  const lengths = new Float64Array(line.length)
  for (const piece of linePieces(grid, line)) {
    let inside = piece.cell >= 0 && active[piece.cell] === 1
    if (piece.face >= 0) {
      const { low, high } = faceOf(grid, piece.face)
      inside = low >= 0 && high >= 0 && active[low] === 1 && active[high] === 1
    }
    if (inside) lengths[piece.at.segment] = (lengths[piece.at.segment] as number) + piece.length
  }
  return lengths
}

/** An end that meets no wall and no edge of the extent may cover its last face in part; any other must be tight. */
function freeEnds(d: Discretised, walls: Wall[], index: number): [boolean, boolean] {
  const line = (walls[index] as Wall).line
  const { xEdges, yEdges, columns, rows } = d.grid
  const tolerance =
    1e-3 *
    Math.min(
      ((xEdges[columns] as number) - (xEdges[0] as number)) / columns,
      ((yEdges[rows] as number) - (yEdges[0] as number)) / rows,
    )
  function isFree(vertex: number): boolean {
    const [x, y] = line[vertex] as Position
    for (const [other, wall] of walls.entries()) {
      for (let s = 0; s + 1 < wall.line.length; s++) {
        if (other === index && (s === vertex || s === vertex - 1)) continue
        if (distanceToSegment(wall.line[s] as Position, wall.line[s + 1] as Position, x, y) < tolerance)
          return false
      }
    }
    return true
  }
  return [isFree(0), isFree(line.length - 1)]
}

function distanceToSegment(a: Position, b: Position, x: number, y: number): number {
  const square = (b[0] - a[0]) ** 2 + (b[1] - a[1]) ** 2
  const along = square === 0 ? 0 : ((x - a[0]) * (b[0] - a[0]) + (y - a[1]) * (b[1] - a[1])) / square
  const t = Math.min(1, Math.max(0, along))
  return Math.hypot(a[0] + t * (b[0] - a[0]) - x, a[1] + t * (b[1] - a[1]) - y)
}

/** One number, or one a vertex; values by stage have been put in place before. */
function alongLine(value: Value, line: Position[] | undefined, path: string): number | number[] {
  if (typeof value === 'number') return requireFinite(value, path)
  if (!Array.isArray(value)) throw new ModelError(path, 'must be a number or one number a vertex')
  if (!line) throw new ModelError(path, 'on a polygon there is one value; an array gives values along a line')
  if (value.length !== line.length) {
    throw new ModelError(path, `has ${value.length} values for a line of ${line.length} vertices`)
  }
  return value.map((entry, index) => requireFinite(entry, `${path}[${index}]`))
}

/** The one value of a row that knows no place along a line. */
function singleValue(value: Value, path: string): number {
  if (typeof value === 'number') return requireFinite(value, path)
  throw new ModelError(path, 'must be one number')
}

function placeBoundaries(d: Discretised): void {
  const boundaries = d.model.boundaries ?? []
  // What acts at each outer face so far, to let a later line replace an earlier one there.
  const atFace = new Map<number, (Exchange | SpecifiedFlow)[]>()
  const replaced = new Set<string>()
  for (const [index, boundary] of boundaries.entries()) {
    const path = `boundaries[${index}]`
    if ((boundary.line === undefined) === (boundary.polygon === undefined)) {
      throw new ModelError(path, 'give either a line or a polygon')
    }
    const acts = boundary.line
      ? placeBoundaryLine(d, boundary, index, boundary.line, atFace, replaced)
      : placeBoundaryPolygon(d, boundary, index, boundary.polygon as Position[], replaced)
    if (!acts) {
      throw new ModelError(
        `${path}.${boundary.line ? 'line' : 'polygon'}`,
        `the boundary ${called(boundary, index)} touches no ${boundary.kind === 'seepage face' ? 'edge' : 'cell'} of the ground`,
      )
    }
  }
  for (const pair of replaced) {
    d.warnings.push({
      code: 'boundary-replaced',
      severity: 'check',
      text: `The boundaries ${pair} share places; the later one counts there.`,
    })
  }
  // A face of a cell that is itself held at a head has nothing left to say.
  d.exchanges = d.exchanges.filter((exchange) => {
    const held = (d.fixedBy[exchange.cell] as number) >= 0
    return !(held && atFaceHead(exchange)) && exchange.width > 0
  })
  d.specifiedFlows = d.specifiedFlows.filter((flow) => flow.width > 0)
}

/** Does the head stand at the face itself, with no more than half a cell between it and the cell's centre? */
export function atFaceHead({ kind }: Exchange): boolean {
  return kind === 'fixed' || kind === 'seepage'
}

interface BoundaryValues {
  head: number | number[]
  conductance: number | number[]
  floor: number | number[]
  flux: number | number[]
}

function valuesOf(boundary: Boundary, line: Position[] | undefined, path: string): BoundaryValues {
  const values: BoundaryValues = {
    head: 0,
    conductance: Number.POSITIVE_INFINITY,
    floor: Number.NEGATIVE_INFINITY,
    flux: 0,
  }
  if (boundary.kind === 'fixed head') values.head = alongLine(boundary.head, line, `${path}.head`)
  if (boundary.kind === 'specified flux') values.flux = alongLine(boundary.flux, line, `${path}.flux`)
  if (boundary.kind === 'head-dependent flux') {
    values.head = alongLine(boundary.head, line, `${path}.head`)
    if (boundary.disconnectsBelow !== undefined) {
      values.floor = alongLine(boundary.disconnectsBelow, line, `${path}.disconnectsBelow`)
    }
  }
  if (boundary.kind === 'drain') values.head = alongLine(boundary.level, line, `${path}.level`)
  if (boundary.kind === 'seepage face') {
    if (!line)
      throw new ModelError(`${path}.polygon`, 'a seepage face is a line along the edge of the ground')
    values.head = line.map(([, y]) => y)
  }
  if (boundary.kind === 'head-dependent flux' || boundary.kind === 'drain') {
    values.conductance = alongLine(boundary.conductance, line, `${path}.conductance`)
    for (const entry of [values.conductance].flat()) requireNotNegative(entry, `${path}.conductance`)
  }
  const heads = [values.head].flat()
  const floors = [values.floor].flat()
  heads.forEach((head, vertex) => {
    if ((floors[vertex] ?? (floors[0] as number)) > head) {
      throw new ModelError(`${path}.disconnectsBelow`, 'lies above the head, so water could never flow in')
    }
  })
  return values
}

function placeBoundaryLine(
  d: Discretised,
  boundary: Boundary,
  index: number,
  line: Position[],
  atFace: Map<number, (Exchange | SpecifiedFlow)[]>,
  replaced: Set<string>,
): boolean {
  const path = `boundaries[${index}]`
  const { grid, active } = d
  checkLine(line, `${path}.line`)
  const values = valuesOf(boundary, line, path)
  const placement = placeLine(grid, active, line)
  if (boundary.kind === 'seepage face') {
    // Water leaves at an edge only; inside the ground there is no face to seep from.
    for (const { length } of placement.cells) placement.lost += length
    placement.cells = []
  }
  if (placement.lost > 1e-6 * lineLength(line)) {
    d.warnings.push({
      code: 'line-outside',
      severity: 'check',
      text: `${percent(placement.lost / lineLength(line))} of the boundary ${called(boundary, index)} lies ${boundary.kind === 'seepage face' ? 'off the edge of' : 'outside'} the ground and has no effect.`,
    })
  }
  for (const { face, cell, share, length, at } of placement.faces) {
    const { axis, length: faceLength, low, lowHalf, highHalf } = faceOf(grid, face)
    const entry = entryAt(boundary, index, values, at, length, {
      cell,
      face,
      axis,
      width: share * faceLength,
      half: cell === low ? lowHalf : highHalf,
      elevation: valueAlong(
        line.map(([, y]) => y),
        at,
      ),
    })
    makeRoom(d, atFace.get(face) ?? [], entry, faceLength, replaced)
    atFace.set(face, [...(atFace.get(face) ?? []), entry])
    addEntry(d, entry)
  }
  if (boundary.kind === 'fixed head') {
    const held = new Map<number, { length: number; sum: number }>()
    for (const { cell, length, at } of placement.cells) {
      const sums = held.get(cell) ?? { length: 0, sum: 0 }
      sums.length += length
      sums.sum += length * valueAlong(values.head, at)
      held.set(cell, sums)
    }
    const shortest = 1e-9 * lineLength(line)
    for (const [cell, { length, sum }] of held)
      if (length > shortest) holdCell(d, cell, sum / length, index, replaced)
  } else {
    for (const { cell, length, at } of placement.cells) {
      addEntry(
        d,
        entryAt(boundary, index, values, at, length, { cell, face: -1, axis: 'x', width: length, half: 0 }),
      )
    }
  }
  return placement.faces.length + placement.cells.length > 0
}

const exchangeKinds = {
  'fixed head': 'fixed',
  'head-dependent flux': 'river',
  drain: 'drain',
  'seepage face': 'seepage',
} as const

type EntryPlace = Pick<Exchange, 'cell' | 'face' | 'axis' | 'width' | 'half' | 'elevation'>

function entryAt(
  boundary: Boundary,
  index: number,
  values: BoundaryValues,
  at: Along,
  amount: number,
  place: EntryPlace,
): Exchange | SpecifiedFlow {
  if (boundary.kind === 'specified flux') {
    const { cell, face, width } = place
    return { index, cell, face, width, rate: amount * valueAlong(values.flux, at) }
  }
  return {
    kind: exchangeKinds[boundary.kind],
    owner: 'boundaries',
    index,
    ...place,
    conductance: amount * valueAlong(values.conductance, at),
    head: valueAlong(values.head, at),
    floor: valueAlong(values.floor, at),
  }
}

function addEntry(d: Discretised, entry: Exchange | SpecifiedFlow): void {
  if ('rate' in entry) d.specifiedFlows.push(entry)
  else d.exchanges.push(entry)
}

/** Shrinks what stands at a face already, so that the later entry finds its covered share free. */
function makeRoom(
  d: Discretised,
  earlier: (Exchange | SpecifiedFlow)[],
  entry: Exchange | SpecifiedFlow,
  faceLength: number,
  replaced: Set<string>,
): void {
  const others = earlier.filter((other) => other.index !== entry.index)
  const own = earlier.filter((other) => other.index === entry.index)
  const taken = others.reduce((sum, other) => sum + other.width, 0)
  const ownTaken = own.reduce((sum, other) => sum + other.width, 0)
  if (ownTaken + entry.width > faceLength) entry.width = Math.max(0, faceLength - ownTaken)
  const left = faceLength - ownTaken - entry.width
  const room = left > 1e-9 * faceLength ? left : 0
  if (taken <= room + 1e-9 * faceLength) return
  const boundaries = d.model.boundaries ?? []
  for (const other of others) {
    const factor = room / taken
    other.width *= factor
    if ('rate' in other) other.rate *= factor
    else if (!atFaceHead(other)) other.conductance *= factor
    const [a, b] = [other.index, entry.index]
    replaced.add(`${called(boundaries[a] as Boundary, a)} and ${called(boundaries[b] as Boundary, b)}`)
  }
}

function holdCell(d: Discretised, cell: number, head: number, index: number, replaced: Set<string>): void {
  const before = d.fixedBy[cell] as number
  const boundaries = d.model.boundaries ?? []
  if (before >= 0 && before !== index && d.fixedHead[cell] !== head) {
    replaced.add(
      `${called(boundaries[before] as Boundary, before)} and ${called(boundaries[index] as Boundary, index)}`,
    )
  }
  d.fixedHead[cell] = head
  d.fixedBy[cell] = index
}

function placeBoundaryPolygon(
  d: Discretised,
  boundary: Boundary,
  index: number,
  given: Position[],
  replaced: Set<string>,
): boolean {
  const path = `boundaries[${index}]`
  if (boundary.kind === 'specified flux') {
    throw new ModelError(`${path}.polygon`, 'a specified flux acts along a line; recharge acts on a polygon')
  }
  const polygon = checkedPolygon(given, `${path}.polygon`)
  const values = valuesOf(boundary, undefined, path)
  const at: Along = { segment: 0, t: 0 }
  let acts = false
  if (boundary.kind === 'fixed head') {
    visitCellsInside(d.grid, polygon, (cell) => {
      if (d.active[cell] !== 1) return
      acts = true
      holdCell(d, cell, valueAlong(values.head, at), index, replaced)
    })
    return acts
  }
  visitOverlaps(d.grid, polygon, (cell, area) => {
    if (d.active[cell] !== 1) return
    acts = true
    addEntry(
      d,
      entryAt(boundary, index, values, at, area, { cell, face: -1, axis: 'x', width: area, half: 0 }),
    )
  })
  return acts
}

function placeLeakage(d: Discretised): void {
  for (const [index, leakage] of (d.model.leakage ?? []).entries()) {
    const path = `leakage[${index}]`
    const head = singleValue(leakage.head, `${path}.head`)
    const leakance = requireNotNegative(leakage.leakance, `${path}.leakance`)
    visitArea(
      d,
      leakage.polygon,
      `${path}.polygon`,
      `The leakage ${called(leakage, index)}`,
      (cell, area) => {
        d.exchanges.push({
          kind: 'river',
          owner: 'leakage',
          index,
          cell,
          face: -1,
          axis: 'x',
          width: area,
          half: 0,
          conductance: leakance * area,
          head,
          floor: Number.NEGATIVE_INFINITY,
        })
      },
    )
  }
}

function placeRecharge(d: Discretised): void {
  for (const [index, recharge] of (d.model.recharge ?? []).entries()) {
    const path = `recharge[${index}]`
    const rate = singleValue(recharge.rate, `${path}.rate`)
    let total = 0
    const visitPlace = d.model.kind === 'section' ? visitTops : visitArea
    visitPlace(
      d,
      recharge.polygon,
      `${path}.polygon`,
      `The recharge ${called(recharge, index)}`,
      (cell, area) => {
        d.recharge[cell] = (d.recharge[cell] as number) + rate * area
        total += rate * area
      },
    )
    d.rechargeByEntry.push(total)
  }
}

/** Every active cell with the area a polygon overlaps, or its whole area; warns when part of the polygon is lost. */
function visitArea(
  d: Discretised,
  given: Position[] | undefined,
  path: string,
  what: string,
  visit: (cell: number, area: number) => void,
): void {
  const { grid, active } = d
  if (!given) {
    for (let j = 0; j < grid.rows; j++) {
      const height = (grid.yEdges[j + 1] as number) - (grid.yEdges[j] as number)
      for (let i = 0; i < grid.columns; i++) {
        const cell = j * grid.columns + i
        if (active[cell] === 1)
          visit(cell, height * ((grid.xEdges[i + 1] as number) - (grid.xEdges[i] as number)))
      }
    }
    return
  }
  const polygon = checkedPolygon(given, path)
  let covered = 0
  visitOverlaps(grid, polygon, (cell, area) => {
    if (active[cell] !== 1) return
    covered += area
    visit(cell, area)
  })
  const whole = Math.abs(signedArea(polygon))
  if (covered < (1 - 1e-6) * whole) {
    d.warnings.push({
      code: 'area-outside',
      severity: 'check',
      text: `${what} acts on ${percent(covered / whole)} of its polygon; the rest lies outside the ground.`,
    })
  }
}

/**
 * The highest cell of every column of a vertical section, with the length along x that a polygon covers there, or its
 * whole width. A polygon counts from its lowest to its highest x, whatever its y.
 */
function visitTops(
  d: Discretised,
  given: Position[] | undefined,
  path: string,
  what: string,
  visit: (cell: number, length: number) => void,
): void {
  const { grid, active } = d
  const { columns, rows, xEdges } = grid
  const xs = given
    ? checkedPolygon(given, path).map(([x]) => x)
    : [Number.NEGATIVE_INFINITY, Number.POSITIVE_INFINITY]
  const [west, east] = [Math.min(...xs), Math.max(...xs)]
  let covered = 0
  for (let i = 0; i < columns; i++) {
    const length = Math.min(east, xEdges[i + 1] as number) - Math.max(west, xEdges[i] as number)
    if (length <= 0) continue
    let j = rows - 1
    while (j >= 0 && active[j * columns + i] !== 1) j--
    if (j < 0) continue
    covered += length
    visit(j * columns + i, length)
  }
  if (given && covered < (1 - 1e-6) * (east - west)) {
    d.warnings.push({
      code: 'area-outside',
      severity: 'check',
      text: `${what} acts on ${percent(covered / (east - west))} of its length; the rest lies beside the ground.`,
    })
  }
}

function percent(share: number): string {
  return `${(100 * share).toPrecision(3)} %`
}

/** Measures every head and level from the middle of those known in any stage. */
function subtractReference(d: Discretised, { lowest, highest }: { lowest: number; highest: number }): void {
  if (highest < lowest) {
    throw new ModelError(
      'boundaries',
      'nothing fixes the level of the heads: give at least one fixed head or head-dependent flux',
    )
  }
  d.reference = lowest + (highest - lowest) / 2
  d.headRange = highest - lowest
  d.highestHead = highest - d.reference
  for (const exchange of d.exchanges) {
    exchange.head -= d.reference
    exchange.floor -= d.reference
  }
  for (let cell = 0; cell < d.fixedHead.length; cell++) {
    d.fixedHead[cell] = (d.fixedHead[cell] as number) - d.reference
  }
  // In a vertical section base and top only say how wide it is.
  if (d.model.kind === 'plan') shiftLevels(d.profiles, d.reference)
  for (const well of d.wells) well.lowestLevel -= d.reference
}

/** Refuses ground that nothing ties to a known level: its heads could be anything. */
function refuseWithoutReference(d: Discretised): void {
  const { grid, active } = d
  const count = active.length
  const part = new Int32Array(count).fill(-1)
  const tied: boolean[] = []
  const drained: boolean[] = []
  const source: number[] = []
  const queue = new Int32Array(count)
  const split = columnFaceCount(grid)
  function isOpen(face: number): boolean {
    return !((d.wallShare[face] as number) >= 1 && d.wallResistance[face] === Number.POSITIVE_INFINITY)
  }
  for (let seed = 0; seed < count; seed++) {
    if (active[seed] !== 1 || (part[seed] as number) >= 0) continue
    const number = tied.length
    tied.push(false)
    drained.push(false)
    source.push(0)
    let length = 0
    queue[length++] = seed
    part[seed] = number
    for (let k = 0; k < length; k++) {
      const cell = queue[k] as number
      const j = Math.floor(cell / grid.columns)
      const i = cell - j * grid.columns
      if ((d.fixedBy[cell] as number) >= 0) tied[number] = true
      source[number] = (source[number] as number) + (d.recharge[cell] as number)
      function visit(next: number, face: number): void {
        if (active[next] !== 1 || (part[next] as number) >= 0 || !isOpen(face)) return
        part[next] = number
        queue[length++] = next
      }
      const westFace = j * (grid.columns + 1) + i
      const southFace = split + j * grid.columns + i
      if (i > 0) visit(cell - 1, westFace)
      if (i < grid.columns - 1) visit(cell + 1, westFace + 1)
      if (j > 0) visit(cell - grid.columns, southFace)
      if (j < grid.rows - 1) visit(cell + grid.columns, southFace + grid.columns)
    }
  }
  for (const exchange of d.exchanges) {
    const number = part[exchange.cell] as number
    if (exchange.conductance === 0) continue
    if (exchange.kind === 'drain' || exchange.kind === 'seepage') drained[number] = true
    else tied[number] = true
  }
  for (const flow of d.specifiedFlows) {
    const number = part[flow.cell] as number
    source[number] = (source[number] as number) + flow.rate
  }
  for (const well of d.wells) {
    for (const { cell, weight } of well.shares) {
      const number = part[cell] as number
      source[number] = (source[number] as number) + weight * well.requested
    }
  }
  for (let number = 0; number < tied.length; number++) {
    if (tied[number] || (drained[number] && (source[number] as number) > 0)) continue
    const cells = part.reduce((sum, entry) => sum + (entry === number ? 1 : 0), 0)
    const seed = part.indexOf(number)
    const j = Math.floor(seed / grid.columns)
    const i = seed - j * grid.columns
    const x = ((grid.xEdges[i] as number) + (grid.xEdges[i + 1] as number)) / 2
    const y = ((grid.yEdges[j] as number) + (grid.yEdges[j + 1] as number)) / 2
    throw new ModelError(
      'boundaries',
      tied.length === 1
        ? 'nothing fixes the level of the heads: give at least one fixed head or head-dependent flux'
        : `${cells} ${cells === 1 ? 'cell' : 'cells'} around (${x}, ${y}) are cut off from every fixed head and head-dependent flux; their heads could be anything`,
    )
  }
}

/**
 * Conductance of each face between two active cells: the half cells and the wall between them in series (harmonic
 * mean), beside the share that no wall covers.
 */
function confinedConductances(d: Discretised): Float64Array {
  const { grid, active, profileOf, profiles } = d
  const { columns, rows, xEdges, yEdges } = grid
  const dry = Number.NEGATIVE_INFINITY
  const full = profiles.map((profile) => {
    const level = Math.max(...profile.top, dry)
    const thickness = thicknessAt(profile, level)
    return {
      x: transmissivityAt(profile, profile.kx, level),
      y: transmissivityAt(profile, profile.ky, level),
      thickness,
    }
  })
  const conductance = new Float64Array(faceCount(grid))
  function between(
    face: number,
    a: number,
    b: number,
    axis: 'x' | 'y',
    la: number,
    lb: number,
    width: number,
  ): number {
    const pa = full[profileOf[a] as number] as (typeof full)[number]
    const pb = full[profileOf[b] as number] as (typeof full)[number]
    const open = la / pa[axis] + lb / pb[axis]
    const share = d.wallShare[face] as number
    if (share === 0) return width / open
    const wall = (d.wallResistance[face] as number) * 0.5 * (1 / pa.thickness + 1 / pb.thickness)
    return width * (share / (open + wall) + (1 - share) / open)
  }
  const split = columnFaceCount(grid)
  for (let j = 0; j < rows; j++) {
    const height = (yEdges[j + 1] as number) - (yEdges[j] as number)
    for (let i = 0; i < columns; i++) {
      const cell = j * columns + i
      if (active[cell] !== 1) continue
      const width = (xEdges[i + 1] as number) - (xEdges[i] as number)
      if (i > 0 && active[cell - 1] === 1) {
        const face = j * (columns + 1) + i
        const west = (xEdges[i] as number) - (xEdges[i - 1] as number)
        conductance[face] = between(face, cell - 1, cell, 'x', west / 2, width / 2, height)
      }
      if (j > 0 && active[cell - columns] === 1) {
        const face = split + j * columns + i
        const south = (yEdges[j] as number) - (yEdges[j - 1] as number)
        conductance[face] = between(face, cell - columns, cell, 'y', south / 2, height / 2, width)
      }
    }
  }
  return conductance
}

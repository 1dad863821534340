import type { Row } from '~/book/row'
import type { SectionKey } from '~/book/sections'
import type { Material, Point, Zone } from '~/ground/ground'
import { levelUnit, type Project } from '~/projects/project'
import type * as File from '~/solver/model'
import { convert, type Dimension, formatNumber, type Quantity, shownUnit } from '~/units'
import type { Boundary, RechargeZone, Wall, Well } from '~/water/water'
import { baseCase, type Case, type CaseSettings, mostCells, overrideOf, settingsOf } from './case'
import { type GridSize, gridSize } from './grid-size'

/** Everything that one calculation case is made of: the rows in force, in the order of their sheets. */
export interface CaseInputs {
  project: Pick<Project, 'number' | 'title' | 'crsEpsg' | 'verticalDatum' | 'units'>
  materials: Row<Material>[]
  zones: Row<Zone>[]
  points: Row<Point>[]
  wells: Row<Well>[]
  rechargeZones: Row<RechargeZone>[]
  boundaries: Row<Boundary>[]
  walls: Row<Wall>[]
  cases: Row<Case>[]
}

/** What stands between the book and a run (a problem), or what a run would do that may surprise (a notice). */
export interface Finding {
  section: SectionKey
  /** Name of the row it is about, '' for the section as a whole. */
  row: string
  rowId: string | null
  message: string
}

export interface FrozenCase {
  /** The model file, in the project's units. */
  model: File.Model
  grid: GridSize
  /** Rows behind `model.points`, in the same order. */
  points: { rowId: string; name: string; x: number; y: number }[]
  /** Points that lie outside the extent of this case and are left out. */
  outside: { rowId: string; name: string; x: number; y: number }[]
  notices: Finding[]
}

export type FreezeAnswer = { ok: true; frozen: FrozenCase } | { ok: false; problems: Finding[] }

/**
 * Turns a case of the book into a model file. A quantity entered in the model's own unit keeps its number exactly;
 * others are converted. Pure: the same rows give the same file. What is missing or contradictory comes back as
 * problems that name section and row; nothing is guessed.
 */
export function freezeCase(inputs: CaseInputs, caseId: string): FreezeAnswer {
  const problems: Finding[] = []
  const notices: Finding[] = []
  const problem = (
    section: SectionKey,
    row: { id: string; body: { name: string } } | null,
    message: string,
  ) => problems.push({ section, row: row?.body.name ?? '', rowId: row?.id ?? null, message })

  const own = inputs.cases.find((row) => row.id === caseId)
  if (!own) {
    problem('cases', null, 'This case is no longer in the book.')
    return { ok: false, problems }
  }
  const settings = settingsOf(baseCase(inputs.cases)?.body, own.body)
  const { units } = inputs.project
  const inModel = (quantity: Quantity, dimension: Dimension) => convert(quantity, shownUnit(dimension, units))

  const { flow, extent, cellSize } = settings
  if (!flow) problem('cases', own, 'Choose confined or unconfined flow, here or in the base case.')
  if (!extent) problem('cases', own, 'Give the extent of the grid, here or in the base case.')
  if (!cellSize) problem('cases', own, 'Give the cell size, here or in the base case.')

  const materialNames = new Map(inputs.materials.map((row) => [row.id, row.body.name]))
  if (inputs.materials.length === 0) problem('ground', null, 'There is no material yet.')
  if (inputs.zones.length === 0) problem('ground', null, 'There is no zone yet: say where the material lies.')
  for (const zone of inputs.zones) {
    if (!materialNames.has(zone.body.materialId))
      problem('ground', zone, 'The material of this zone is no longer in the book.')
    const { base, top } = zone.body
    if (flow === 'confined' && !top)
      problem('ground', zone, 'Confined flow needs the top level of this zone.')
    if (top && inModel(top, 'length') <= inModel(base, 'length'))
      problem('ground', zone, 'The top level must lie above the base level.')
  }
  const holdsTheHead = inputs.boundaries.some((row) => row.body.kind !== 'specified flux')
  if (!holdsTheHead)
    problem(
      'water',
      null,
      'No boundary holds a head: a steady case needs one fixed head or head-dependent flux.',
    )
  for (const [section, rows, what] of [
    ['ground', inputs.materials, 'materials'],
    ['ground', inputs.points, 'points'],
    ['water', inputs.wells, 'wells'],
    ['water', inputs.rechargeZones, 'recharge zones'],
    ['water', inputs.boundaries, 'boundaries'],
    ['water', inputs.walls, 'walls'],
  ] as const) {
    for (const row of sameNames(rows))
      problem(section, row, `Two ${what} have this name: results are listed by name, give each its own.`)
  }
  if (extent) {
    for (const well of inputs.wells) {
      if (!within(extent, well.body)) problem('water', well, 'This well lies outside the extent of the case.')
    }
    for (const boundary of inputs.boundaries) {
      if (!touches(extent, boundary.body.line))
        problem('water', boundary, 'This boundary lies outside the extent of the case.')
    }
  }
  const grid = extent && cellSize ? gridSize(extent, cellSize, units) : null
  if (grid && grid.cells > mostCells) {
    problem(
      'cases',
      own,
      `${formatNumber(grid.cells, 0)} cells are too many: at most ${formatNumber(mostCells, 0)}. Choose larger cells or a smaller extent.`,
    )
  }
  if (problems.length > 0 || !flow || !extent || !cellSize || !grid) return { ok: false, problems }

  const inside = inputs.points.filter((row) => within(extent, row.body))
  const outside = inputs.points.filter((row) => !within(extent, row.body))
  for (const point of outside) {
    notices.push({
      section: 'ground',
      row: point.body.name,
      rowId: point.id,
      message: 'This point lies outside the extent of the case and is left out.',
    })
  }
  notices.push(...crowding(inputs, extent, grid))

  const placed = ({ id, body: { name, x, y } }: Row<Point>) => ({ rowId: id, name, x, y })
  const sourced = (source: string) => (source === '' ? {} : { source })
  const model: File.Model = {
    format: 'lavant-model',
    version: 1,
    title: `${inputs.project.number} ${inputs.project.title}: ${own.body.name}`,
    place: {
      crs: `EPSG:${inputs.project.crsEpsg}`,
      origin: [0, 0],
      verticalDatum: levelUnit(inputs.project.units.length, inputs.project.verticalDatum),
    },
    units: { length: units.length, time: units.time },
    kind: 'plan',
    flow,
    extent: { x: [extent.xMin, extent.xMax], y: [extent.yMin, extent.yMax] },
    grid: { columns: grid.columns, rows: grid.rows },
    time: { kind: 'steady' },
    materials: inputs.materials.map((row) => materialOf(row, settings, inModel)),
    ground: inputs.zones.map(({ body: zone }) => ({
      ...(zone.polygon ? { polygon: zone.polygon } : {}),
      material: materialNames.get(zone.materialId) ?? '',
      base: inModel(zone.base, 'length'),
      ...(zone.top ? { top: inModel(zone.top, 'length') } : {}),
      ...sourced(zone.source),
    })),
    wells: inputs.wells.map(({ id, body: well }) => ({
      name: well.name,
      x: well.x,
      y: well.y,
      kind: well.kind,
      rate: inModel(overrideOf(settings.overrides, id, 'rate') ?? well.rate, 'rate'),
      ...(well.radius ? { radius: inModel(well.radius, 'length') } : {}),
      ...(well.lowestLevel ? { lowestLevel: inModel(well.lowestLevel, 'length') } : {}),
      ...(well.screenTop && well.screenBottom
        ? { screen: { top: inModel(well.screenTop, 'length'), bottom: inModel(well.screenBottom, 'length') } }
        : {}),
      ...sourced(well.source),
    })),
    recharge: inputs.rechargeZones.map(({ id, body: zone }) => ({
      name: zone.name,
      ...(zone.polygon ? { polygon: zone.polygon } : {}),
      rate: inModel(overrideOf(settings.overrides, id, 'recharge') ?? zone.rate, 'conductivity'),
      ...sourced(zone.source),
    })),
    boundaries: inputs.boundaries.map((row) => boundaryOf(row, settings, inModel)),
    walls: inputs.walls.map(({ id, body: wall }) => ({
      name: wall.name,
      line: wall.line,
      thickness: inModel(wall.thickness, 'length'),
      k: inModel(overrideOf(settings.overrides, id, 'k') ?? wall.k, 'conductivity'),
      ...(wall.toe ? { toe: inModel(wall.toe, 'length') } : {}),
      ...sourced(wall.source),
    })),
    points: inside.map(({ body: { name, x, y, source } }) => ({ name, x, y, ...sourced(source) })),
    solver: { method: settings.method, tolerance: settings.tolerance },
    ...(settings.verify ? { want: { verify: true } } : {}),
  }
  return {
    ok: true,
    frozen: { model, grid, points: inside.map(placed), outside: outside.map(placed), notices },
  }
}

type InModel = (quantity: Quantity, dimension: Dimension) => number

function materialOf(
  { id, body: material }: Row<Material>,
  settings: CaseSettings,
  inModel: InModel,
): File.Material {
  const ownKx = inModel(material.kx, 'conductivity')
  const ownKy = inModel(material.ky, 'conductivity')
  const override = overrideOf(settings.overrides, id, 'k')
  const kx = override ? inModel(override, 'conductivity') : ownKx
  return {
    name: material.name,
    kx,
    ky: override ? (ownKx === ownKy ? kx : kx * (ownKy / ownKx)) : ownKy,
    ...(material.specificStorage ? { specificStorage: inModel(material.specificStorage, 'per length') } : {}),
    ...(material.specificYield === null ? {} : { specificYield: material.specificYield }),
    ...(material.porosity === null ? {} : { porosity: material.porosity }),
    ...(material.source === '' ? {} : { source: material.source }),
  }
}

function boundaryOf(
  { id, body: boundary }: Row<Boundary>,
  settings: CaseSettings,
  inModel: InModel,
): File.Boundary {
  const place = {
    name: boundary.name,
    line: boundary.line,
    ...(boundary.outer ? { outer: true } : {}),
    ...(boundary.source === '' ? {} : { source: boundary.source }),
  }
  if (boundary.kind === 'specified flux') {
    const flux = overrideOf(settings.overrides, id, 'flux') ?? needed(boundary.flux)
    // The person chose a direction and no sign; in the model file positive means into the model.
    const sign = boundary.direction === 'into the model' ? 1 : -1
    const amount = inModel(flux, 'line flux')
    return { ...place, kind: 'specified flux', flux: amount === 0 ? 0 : sign * amount }
  }
  const level = overrideOf(settings.overrides, id, 'level')
  const levels = (level ? [level] : needed(boundary.levels)).map((one) => inModel(one, 'length'))
  const along = levels.length === 1 ? needed(levels[0]) : levels
  if (boundary.kind === 'fixed head') return { ...place, kind: 'fixed head', head: along }
  const conductance = inModel(needed(boundary.conductance), 'conductivity')
  if (boundary.kind === 'drain') return { ...place, kind: 'drain', level: along, conductance }
  return {
    ...place,
    kind: 'head-dependent flux',
    head: along,
    conductance,
    ...(boundary.disconnectsBelow ? { disconnectsBelow: inModel(boundary.disconnectsBelow, 'length') } : {}),
  }
}

/** The schema of a row already asked for it; a row without it never reached the book. */
function needed<T>(value: T | null | undefined): T {
  if (value === null || value === undefined)
    throw new Error('A row of the book lacks what its schema asks for.')
  return value
}

interface Spot {
  x: number
  y: number
}

function within(extent: NonNullable<CaseSettings['extent']>, { x, y }: Spot): boolean {
  return x >= extent.xMin && x <= extent.xMax && y >= extent.yMin && y <= extent.yMax
}

/** True when any part of the line lies in the extent or on its edge (Liang and Barsky 1984). */
function touches(extent: NonNullable<CaseSettings['extent']>, line: readonly [number, number][]): boolean {
  for (let i = 1; i < line.length; i++) {
    const [x1, y1] = line[i - 1] as [number, number]
    const [x2, y2] = line[i] as [number, number]
    let from = 0
    let to = 1
    for (const [start, step, low, high] of [
      [x1, x2 - x1, extent.xMin, extent.xMax],
      [y1, y2 - y1, extent.yMin, extent.yMax],
    ] as const) {
      if (step === 0) {
        if (start < low || start > high) to = -1
      } else {
        const enters = (low - start) / step
        const leaves = (high - start) / step
        from = Math.max(from, Math.min(enters, leaves))
        to = Math.min(to, Math.max(enters, leaves))
      }
    }
    if (from <= to) return true
  }
  return false
}

function sameNames(rows: readonly Row<{ name: string }>[]): Row<{ name: string }>[] {
  const seen = new Set<string>()
  return rows.filter(({ body: { name } }) => {
    if (seen.has(name)) return true
    seen.add(name)
    return false
  })
}

/** Fewer cells than this between a well and a fixed head, and the head at the well is not to be trusted. */
const fewestCellsBetween = 3

/** Wells that share a cell, and wells so near a fixed head that they draw from it rather than from the ground. */
function crowding(
  inputs: Pick<CaseInputs, 'wells' | 'boundaries'>,
  extent: NonNullable<CaseSettings['extent']>,
  grid: GridSize,
): Finding[] {
  const found: Finding[] = []
  const byCell = new Map<string, Row<Well>>()
  for (const well of inputs.wells) {
    const column = Math.min(grid.columns - 1, Math.floor((well.body.x - extent.xMin) / grid.width))
    const row = Math.min(grid.rows - 1, Math.floor((well.body.y - extent.yMin) / grid.height))
    const finding = (message: string) =>
      found.push({ section: 'water', row: well.body.name, rowId: well.id, message })
    const other = byCell.get(`${column} ${row}`)
    if (other) finding(`Lies in the same cell as ${other.body.name}: how they draw on each other is lost.`)
    else byCell.set(`${column} ${row}`, well)
    for (const boundary of inputs.boundaries) {
      if (boundary.body.kind !== 'fixed head') continue
      const cells = cellsToLine(well.body, boundary.body.line, grid)
      if (cells < fewestCellsBetween)
        finding(
          `Only ${formatNumber(cells, 1)} cells from ${boundary.body.name}, a fixed head: it would draw from there directly. Use smaller cells.`,
        )
    }
  }
  return found
}

/** Distance from a spot to a line, measured in cells. */
function cellsToLine(spot: Spot, line: readonly [number, number][], grid: GridSize): number {
  let nearest = Number.POSITIVE_INFINITY
  for (let i = 1; i < line.length; i++) {
    const [x1, y1] = line[i - 1] as [number, number]
    const [x2, y2] = line[i] as [number, number]
    const ax = (x1 - spot.x) / grid.width
    const ay = (y1 - spot.y) / grid.height
    const dx = (x2 - x1) / grid.width
    const dy = (y2 - y1) / grid.height
    const long = dx * dx + dy * dy
    const t = long === 0 ? 0 : Math.min(1, Math.max(0, -(ax * dx + ay * dy) / long))
    nearest = Math.min(nearest, Math.hypot(ax + t * dx, ay + t * dy))
  }
  return nearest
}

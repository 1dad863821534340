import type { Discretised } from './discretise'
import { facesOfCell } from './faces'
import { centresOf } from './grid'
import type { Boundary, Model, Position } from './model'
import { modelOfStage } from './stages'

/** A model with other outer boundaries, and what was done to them. */
export interface Swap {
  model: Model
  text: string
}

/**
 * The model with its outer fixed heads and outer head-dependent fluxes closed (no flow), real ones left as they are.
 * Something must still hold the level: without any other head the outer boundary farthest from the wells stays. A
 * string says why there is nothing to close.
 */
export function withOuterClosed(model: Model): Swap | string {
  const boundaries = model.boundaries ?? []
  const outer = boundaries.filter(
    ({ kind, outer }) => outer && (kind === 'fixed head' || kind === 'head-dependent flux'),
  )
  if (outer.length === 0) return 'no boundary that holds a head is marked as outer'
  const held =
    model.time.kind === 'transient' ||
    boundaries.some(
      ({ kind, outer }) => !outer && (kind === 'fixed head' || kind === 'head-dependent flux'),
    ) ||
    (model.leakage ?? []).some(({ leakance }) => leakance > 0)
  let kept: Boundary | null = null
  if (!held) {
    if (outer.length === 1) return `"${outer[0]?.name}" alone holds the level of the heads`
    kept = farthestFromWells(model, outer)
  }
  const closed = outer.filter((boundary) => boundary !== kept)
  return {
    model: { ...model, boundaries: boundaries.filter((boundary) => !closed.includes(boundary)) },
    text: `${closed.map(({ name }) => `"${name}"`).join(', ')} closed${
      kept ? `; "${kept.name}" stays, or nothing would hold the level of the heads` : ''
    }`,
  }
}

function farthestFromWells(model: Model, outer: Boundary[]): Boundary {
  const places = model.wells ?? []
  const distance = (boundary: Boundary) => {
    const corners = boundary.line ?? boundary.polygon ?? []
    return Math.min(
      ...corners.flatMap(([x, y]) => places.map((well) => Math.hypot(well.x - x, well.y - y))),
      Number.MAX_VALUE,
    )
  }
  return outer.reduce((best, boundary) => (distance(boundary) > distance(best) ? boundary : best))
}

/** The model without its wells, in steady flow with its first stage's values: the ground at rest. */
export function undisturbed(model: Model): Model {
  return { ...modelOfStage(model, 0), time: { kind: 'steady' }, wells: [] }
}

/** Has the model edges that nothing is said about, and wells that could reach them? A string says why not. */
export function openEdges(d: Discretised): 'open' | string {
  if (d.wells.every(({ requested }) => requested === 0)) return 'no well draws on the edges'
  if (runsOfOpenFaces(d).length === 0) return 'every edge of the extent has a boundary'
  return 'open'
}

/**
 * The model with the edges of its extent that no boundary is given for held at the heads of the ground at rest:
 * `heads` by cell in the model's datum. In a section only its two ends; its bottom is where the ground ends.
 */
export function withEdgesHeld(model: Model, d: Discretised, heads: Float64Array): Swap {
  const sides = new Set<string>()
  const added = runsOfOpenFaces(d).map(({ side, line, cells }, index): Boundary => {
    sides.add(side)
    const values = cells.map((cell) => heads[cell] as number)
    return {
      name: `Edge ${index + 1}`,
      kind: 'fixed head',
      line,
      head: [values[0] as number, ...values, values[values.length - 1] as number],
    }
  })
  // Given first, so that every boundary of the model itself counts where it meets an edge.
  return {
    model: { ...model, boundaries: [...added, ...(model.boundaries ?? [])] },
    text: `the open edges (${[...sides].join(', ')}) held at the heads without wells`,
  }
}

interface OpenRun {
  side: string
  /** The run's two ends, with the middle of every face between. */
  line: Position[]
  cells: number[]
}

function runsOfOpenFaces(d: Discretised): OpenRun[] {
  const { grid, active } = d
  const { columns, rows, xEdges, yEdges } = grid
  const covered = new Set([...d.exchanges, ...d.specifiedFlows].map(({ face }) => face))
  const xCentres = centresOf(xEdges)
  const yCentres = centresOf(yEdges)
  const runs: OpenRun[] = []
  const isOpen = (cell: number, which: 0 | 1 | 2 | 3) =>
    active[cell] === 1 && (d.fixedBy[cell] as number) < 0 && !covered.has(facesOfCell(grid, cell)[which])
  function alongSide(
    side: string,
    which: 0 | 1 | 2 | 3,
    cells: number[],
    vertical: boolean,
    across: number,
  ): void {
    const edges = vertical ? yEdges : xEdges
    const centres = vertical ? yCentres : xCentres
    const place = (along: number): Position => (vertical ? [across, along] : [along, across])
    let run: OpenRun | null = null
    cells.forEach((cell, k) => {
      if (!isOpen(cell, which)) {
        run = null
        return
      }
      if (!run) {
        run = { side, line: [place(edges[k] as number), place(edges[k] as number)], cells: [] }
        runs.push(run)
      }
      run.line.splice(-1, 1, place(centres[k] as number), place(edges[k + 1] as number))
      run.cells.push(cell)
    })
  }
  const range = (count: number, cell: (k: number) => number) =>
    Array.from({ length: count }, (_, k) => cell(k))
  alongSide(
    'west',
    0,
    range(rows, (j) => j * columns),
    true,
    xEdges[0] as number,
  )
  alongSide(
    'east',
    1,
    range(rows, (j) => j * columns + columns - 1),
    true,
    xEdges[columns] as number,
  )
  if (d.model.kind === 'section') return runs
  alongSide(
    'south',
    2,
    range(columns, (i) => i),
    false,
    yEdges[0] as number,
  )
  alongSide(
    'north',
    3,
    range(columns, (i) => (rows - 1) * columns + i),
    false,
    yEdges[rows] as number,
  )
  return runs
}

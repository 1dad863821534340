import { type GridError, gridError, safetyFactor } from './convergence'
import type { Discretised } from './discretise'
import { comparisonOf } from './formulas/compare'
import { type GridChoice, gridChoice, onGrid } from './grid-variants'
import type { Model } from './model'
import { ModelError } from './model-error'
import { type NamedValue, namedValues } from './named-values'
import { openEdges, undisturbed, withEdgesHeld, withOuterClosed } from './outer-boundary'
import { interpolationErrors, shiftedNames, withShiftedLines } from './placement-errors'
import type { Band, Result, SwapResult, Verification, VerifiedResult, Warning } from './result'

/** What is asked of whoever solves: the model as it is given, or with every step in time halved. */
export interface Variant {
  phase: string
  halveSteps?: boolean
}

export interface Solved {
  result: Result
  heads: Float64Array
  /** Transient flow: the heads before the first step and at every reported time. Else empty. */
  fields: { heads: Float64Array }[]
  cancelled: boolean
}

export type SolveVariant = (model: Model, variant: Variant) => Solved

export interface VerifyOptions {
  /** No variant is computed on more cells than this. */
  mostCells?: number
}

const usualMostCells = 1_100_000

/** A change of this share of what it is a change of is worth a warning, where outer boundaries are swapped. */
const controlled = 0.05

/**
 * The verification trio of a run: its results on three grids, with steps in time halved, and with the outer boundaries
 * swapped; and beside a formula where one holds. `own` is the run itself, `d` the model laid out (first stage). Each
 * named result gets a band, its value and the estimated error on both sides: that of the grid, of the steps in time,
 * and of stopping the iterations. The outer boundary is a choice, no error: what the swap changes is reported apart.
 * Null when cancelled.
 */
export function verificationOf(
  model: Model,
  d: Discretised,
  own: Solved,
  solve: SolveVariant,
  { mostCells = usualMostCells }: VerifyOptions = {},
): Verification | null {
  const plain: Model = { ...model, want: {} }
  const ends =
    model.time.kind === 'transient' ? { ...plain, time: { ...model.time, report: 'stages' as const } } : plain
  const tries = triesOf(solve)
  const columns = own.result.grid.columns
  const rows = own.result.grid.rows
  const choice = gridChoice(columns * rows, columns, rows, mostCells)
  const grids = gridsOf({ ...ends, lines: withShiftedLines(d) }, own, choice, tries)
  const halved =
    model.time.kind === 'transient' ? tries(ends, { phase: 'steps halved', halveSteps: true }) : null
  const outer =
    columns * rows <= mostCells
      ? outerOf(ends, d, own, tries)
      : [{ text: `Not swapped: there are more than ${mostCells} cells.`, done: false, solved: null }]
  if (tries.cancelled) return null
  // The head of a well's cells depends on their size for good reason: only that at its face can converge.
  const named = namedValues(own.result).filter(({ ofCells }) => !ofCells)
  const floor = floorOf([own, ...grids.solved.map(({ solved }) => solved)])
  const evidence: Evidence = {
    own,
    grids: grids.solved,
    halved,
    outer,
    floor,
    interpolation: interpolationOf(d, own),
  }
  const results = named.map((entry) => verified(entry, evidence))
  return {
    grid: {
      grids: grids.solved.map(({ times, solved }) => {
        const { columns, rows, cells } = solved.result.grid
        return { columns, rows, cells, times }
      }),
      why: grids.why,
    },
    time:
      model.time.kind !== 'transient'
        ? null
        : {
            halved: halved !== null,
            ...(tries.refused.has('steps halved') ? { why: tries.refused.get('steps halved') } : {}),
          },
    outerBoundary: outer.map(({ text, done }) => ({ text, done })),
    formula: comparisonOf(model, own.result),
    results,
  }
}

interface Tries {
  (model: Model, variant: Variant): Solved | null
  cancelled: boolean
  /** Why a variant could not be computed, by phase. */
  refused: Map<string, string>
}

/** Solves variants; one that cannot be computed or does not converge is left out, and why is remembered. */
function triesOf(solve: SolveVariant): Tries {
  const tries: Tries = Object.assign(
    (model: Model, variant: Variant): Solved | null => {
      if (tries.cancelled) return null
      try {
        const solved = solve(model, variant)
        if (solved.cancelled) tries.cancelled = true
        else if (solved.result.converged) return solved
        else tries.refused.set(variant.phase, 'it did not converge')
      } catch (error) {
        if (!(error instanceof ModelError)) throw error
        tries.refused.set(variant.phase, `${error.path}: ${error.message}`)
      }
      return null
    },
    { cancelled: false, refused: new Map<string, string>() },
  )
  return tries
}

interface OnGrid {
  times: number
  solved: Solved
}

/** The model's results on its own grid and others, finest first. */
function gridsOf(
  model: Model,
  own: Solved,
  choice: GridChoice,
  tries: Tries,
): { solved: OnGrid[]; why: string } {
  const solved: OnGrid[] = []
  let why = choice.why
  function add(times: number): boolean {
    const phase = times < 1 ? `grid ${1 / times} times as fine` : `grid ${times} times as coarse`
    const found = tries(onGrid(model, times), { phase })
    if (found) solved.push({ times, solved: found })
    else if (tries.refused.has(phase)) why += `; ${phase}: ${tries.refused.get(phase)}`
    return found !== null
  }
  for (const times of choice.times) {
    if (times === 1) {
      solved.push({ times, solved: own })
      continue
    }
    // Features may be too small for a coarser grid; then a finer one takes its place.
    if (!add(times) && times === 2 && choice.times.includes(0.5)) add(0.25)
  }
  return { solved: solved.sort((a, b) => cellsOf(b) - cellsOf(a)), why }
}

function cellsOf({ solved }: OnGrid): number {
  return solved.result.grid.cells
}

/** Cell sizes relative to each other, from the cells that there really are. */
function sizesOf(grids: OnGrid[]): number[] {
  const first = (grids[0] as OnGrid).solved.result.grid
  return grids.map(({ solved }) => {
    const { columns, rows } = solved.result.grid
    const alongX = first.columns / columns
    const alongY = first.rows / rows
    // A strip of one row is as coarse as its columns say.
    if (rows === 1 || first.rows === 1) return alongX
    if (columns === 1 || first.columns === 1) return alongY
    return Math.sqrt(alongX * alongY)
  })
}

interface OuterTry extends SwapResult {
  solved: Solved | null
}

function outerOf(model: Model, d: Discretised, own: Solved, tries: Tries): OuterTry[] {
  const found: OuterTry[] = []
  const closed = withOuterClosed(model)
  if (typeof closed === 'string')
    found.push({ text: `Outer heads are not closed: ${closed}.`, done: false, solved: null })
  else
    found.push(
      swapped(
        closed.text,
        tries(closed.model, { phase: 'outer boundary closed' }),
        tries,
        'outer boundary closed',
      ),
    )
  const open = openEdges(d)
  const rest = open === 'open' ? tries(undisturbed(model), { phase: 'the ground at rest' }) : null
  if (rest && rest.heads.length === own.heads.length) {
    const held = withEdgesHeld(model, d, rest.heads)
    found.push(swapped(held.text, tries(held.model, { phase: 'open edges held' }), tries, 'open edges held'))
  } else {
    const why =
      open === 'open' ? (tries.refused.get('the ground at rest') ?? 'the ground at rest is not known') : open
    found.push({ text: `Open edges are not held: ${why}.`, done: false, solved: null })
  }
  return found
}

function swapped(text: string, solved: Solved | null, tries: Tries, phase: string): OuterTry {
  if (solved) return { text: `${text.charAt(0).toUpperCase()}${text.slice(1)}.`, done: true, solved }
  return {
    text: `Not computed with ${text}: ${tries.refused.get(phase) ?? 'stopped'}.`,
    done: false,
    solved: null,
  }
}

interface Floor {
  head: number
  flow: number
}

/** What stopping the iterations, and rounding, leave open in any head and any flow. */
function floorOf(solved: Solved[]): Floor {
  let head = 0
  let flow = 0
  for (const { result } of solved) {
    const levels = [
      ...result.points.map((point) => point.head),
      ...result.wells.map((well) => well.cellHead),
    ].flat()
    const largest = Math.max(0, ...levels.map((level) => Math.abs(level ?? 0)))
    head = Math.max(head, 4 * result.headError + 1e-13 * largest)
    const through = Math.max(...result.balance.inflow, ...result.balance.outflow, 0)
    flow = Math.max(flow, Math.max(result.residual, 1e-14) * Math.sqrt(result.grid.cells) * through)
  }
  return { head, flow }
}

function valueIn(solved: Solved, name: string, time: number | null): number | null {
  const values = namedValues(solved.result).find((entry) => entry.name === name)?.values
  if (!values) return null
  if (time === null) return values[0] ?? null
  const at = solved.result.times.findIndex(
    (other) => Math.abs(other - time) <= 1e-9 * Math.max(1, Math.abs(time)),
  )
  return at < 0 ? null : (values[at] ?? null)
}

interface Evidence {
  own: Solved
  /** Finest first. */
  grids: OnGrid[]
  halved: Solved | null
  outer: OuterTry[]
  floor: Floor
  /** By point and reported time. */
  interpolation: number[][]
}

/** What interpolation leaves out at each point, by reported time. */
function interpolationOf(d: Discretised, own: Solved): number[][] {
  const moments = own.fields.length > 0 ? own.fields.slice(1).map(({ heads }) => heads) : [own.heads]
  const byTime = moments.map((heads) => interpolationErrors(d, heads))
  return (d.model.points ?? []).map((_, index) => byTime.map((errors) => errors[index] as number))
}

function verified(entry: NamedValue, evidence: Evidence): VerifiedResult {
  const { own, halved, outer, floor } = evidence
  const steady = own.result.times.length === 0
  const found: VerifiedResult = {
    name: entry.name,
    band: [],
    order: [],
    extrapolated: [],
    how: [],
    gridError: [],
    ...(steady ? {} : { timeError: [] }),
    swapped: outer.filter(({ solved }) => solved).map(({ text }) => ({ text, values: [] })),
  }
  entry.values.forEach((value, k) => {
    const time = steady ? null : (own.result.times[k] as number)
    const error = value === null ? null : errorOnGrids(entry.name, time, k, evidence)
    const step = value === null || !halved ? null : valueIn(halved, entry.name, time)
    const atStep = steady ? 0 : step === null ? null : stepFactor * Math.abs((value as number) - step)
    found.order.push(error?.order ?? null)
    found.extrapolated.push(error?.extrapolated ?? null)
    found.how.push(error?.how ?? 'none')
    found.gridError.push(error && error.how !== 'none' ? error.error : null)
    found.timeError?.push(atStep)
    found.band.push(bandOf(value, error, atStep, entry.quantity === 'gradient' ? 0 : floor[entry.quantity]))
    let which = 0
    for (const { solved } of outer) {
      if (solved) found.swapped[which++]?.values.push(valueIn(solved, entry.name, time))
    }
  })
  return found
}

/** Halved steps leave at most as much again as they change (first order), with the safety factor. */
const stepFactor = 2 * safetyFactor

function errorOnGrids(name: string, time: number | null, k: number, evidence: Evidence): GridError {
  const { grids } = evidence
  const usable = grids.flatMap((grid) => {
    const value = valueIn(grid.solved, name, time)
    return value === null ? [] : [{ grid, value }]
  })
  const own = usable.findIndex(({ grid }) => grid.times === 1)
  if (own < 0) return { error: 0, order: null, extrapolated: null, how: 'none' }
  const found = gridError(
    usable.map(({ value }) => value),
    sizesOf(usable.map(({ grid }) => grid)),
    own,
  )
  return { ...found, error: Math.max(found.error, placement(name, time, k, evidence)) }
}

/** What the place of a point between centres, or of a line between faces, may be worth on the model's own grid. */
function placement(
  name: string,
  time: number | null,
  k: number,
  { own, grids, interpolation }: Evidence,
): number {
  const point = own.result.points.findIndex((row) => `points/${row.name}` === name)
  if (point >= 0) return safetyFactor * (interpolation[point]?.[k] ?? 0)
  const finest = grids[0] as OnGrid
  if (!name.startsWith('lines/') || finest.times >= 1) return 0
  const here = valueIn(finest.solved, name, time)
  return Math.max(
    0,
    ...shiftedNames(name).map((other) => changeOf(here, valueIn(finest.solved, other, time))),
  )
}

function bandOf(value: number | null, error: GridError | null, atStep: number | null, floor: number): Band {
  if (value === null || !error || error.how === 'none' || atStep === null) return null
  const half = error.error + atStep + floor
  return [value - half, value + half]
}

/** Puts the bands beside the results they belong to, and warns where the outer boundary decides. */
export function applyVerification(result: Result, verification: Verification): void {
  result.verification = verification
  const bands = new Map(verification.results.map(({ name, band }) => [name, band]))
  const put = (row: { name: string; band?: Band[] }, name: string) => {
    const band = bands.get(name)
    if (band) row.band = band
  }
  for (const row of result.points) put(row, `points/${row.name}`)
  for (const row of result.wells) put(row, `wells/${row.name}`)
  for (const row of result.lines) put(row, `lines/${row.name}`)
  for (const row of result.rings) put(row, `rings/${row.name}/through`)
  for (const row of result.gradients ?? []) put(row, `gradients/${row.name}`)
  result.warnings.push(...warningsOf(result, verification))
}

function warningsOf(result: Result, { results, grid }: Verification): Warning[] {
  const warnings: Warning[] = []
  const named = new Map(namedValues(result).map((entry) => [entry.name, entry]))
  const heads = [...named.values()]
    .filter(({ quantity }) => quantity === 'head')
    .flatMap(({ values }) => values)
  const known = heads.filter((head) => head !== null)
  const range = known.length > 0 ? Math.max(...known) - Math.min(...known) : 0
  const through = Math.max(...result.balance.inflow, ...result.balance.outflow)
  const byText = new Map<string, string[]>()
  for (const { name, swapped } of results) {
    const own = named.get(name) as NamedValue
    const largest = Math.max(...own.values.map((value) => Math.abs(value ?? 0)))
    const scale = { head: range, flow: through, gradient: largest }[own.quantity]
    for (const { text, values } of swapped) {
      const change = Math.max(0, ...values.map((value, k) => changeOf(own.values[k] ?? null, value)))
      if (change > controlled * scale) byText.set(text, [...(byText.get(text) ?? []), name])
    }
  }
  for (const [text, names] of byText) {
    warnings.push({
      code: 'boundary-controlled',
      severity: 'check',
      text: `The outer boundary decides ${names.length === 1 ? 'a result' : `${names.length} results`}: ${listed(names)} would change by more than 5 % (heads: of their range; flows: of the throughflow). ${text}`,
    })
  }
  if (grid.grids.length < 2) {
    warnings.push({
      code: 'grid-not-verified',
      severity: 'check',
      text: `There is no second grid to compare with, so no error band: ${grid.why}.`,
    })
  }
  return warnings
}

function changeOf(own: number | null, other: number | null): number {
  return own === null || other === null ? 0 : Math.abs(own - other)
}

function listed(names: string[]): string {
  const shown = names.slice(0, 4).map((name) => `"${name.slice(name.indexOf('/') + 1)}"`)
  return shown.join(', ') + (names.length > 4 ? ' and others' : '')
}

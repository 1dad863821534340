import type { Discretised } from './discretise'
import type { CornerMatrix, Matrix } from './flow'
import type { Kernels } from './linear/kernels'
import { prepareMultigrid } from './linear/multigrid'
import type { LinearSystem, Prepared } from './linear/system'
import { solveUnsymmetric } from './linear/unsymmetric'
import { relax, scaledSystem, slowestMode } from './sor'
import { type Zones, zonesOf } from './zones'

export type Method = 'sor' | 'multigrid'

export interface StepOptions {
  /** Norm of the residual to reach ... */
  target: number
  /**
   * ... with the estimated error of every head at most this share of the range of the heads' changes; infinite: it is
   * not asked for, and need not be estimated.
   */
  headTolerance: number
  /** Sweeps (relaxation) or cycles (multigrid). */
  mostIterations: number
  /** Told now and then; true stops. */
  watch: (iterations: number, residual: number) => boolean
}

export interface StepOutcome {
  iterations: number
  /** Norm of the residual. */
  residual: number
  /** Estimate of the largest error left in any head. */
  headError: number
  ended: 'converged' | 'stalled' | 'iterations' | 'cancelled'
}

/** Solves the systems of Newton's steps, by one of the methods, in the memory it keeps. */
export interface LinearStep {
  method: Method
  /** Must the matrix be set up anew before the next solve? Relaxation scales it in place, so always. */
  stale: boolean
  /** Change of the system's unknown, one a cell; what `solve` leaves. */
  y: Float64Array
  solve(matrix: Matrix, rightHandSide: Float64Array, options: StepOptions): StepOutcome
  /** Smallest eigenvalue of the scaled matrix, as last estimated: what an imbalance costs in head at the worst. */
  lambda: number
  /** What did the work: for the record of a run. */
  kernels: string
}

export interface LinearStepOptions {
  /** Compiled kernels of the fast method; without them their TypeScript twins serve. */
  kernels?: Kernels
  /** Told how long each solve took, set-up included: seconds. */
  onLinearSolve?: (seconds: number) => void
}

/** Sweeps (SOR) or cycles (multigrid) allowed for a model of `cells`. */
export function mostIterations(method: Method, cells: number): number {
  return method === 'sor' ? Math.min(60_000, Math.max(200, Math.floor(2e11 / cells))) : 2000
}

/** The step solver of a method for a model's grid. */
export function linearStepOf(
  method: Method,
  d: Discretised,
  { kernels, onLinearSolve }: LinearStepOptions,
): LinearStep {
  const step = method === 'sor' ? relaxation(d) : multigrid(d, kernels)
  if (!onLinearSolve) return step
  const { solve } = step
  step.solve = (matrix, rightHandSide, options) => {
    const started = performance.now()
    const outcome = solve(matrix, rightHandSide, options)
    onLinearSolve((performance.now() - started) / 1000)
    return outcome
  }
  return step
}

/** Successive over-relaxation (sor.ts), zones that hang together corrected as a whole where that is worth it. */
function relaxation(d: Discretised): LinearStep {
  const { columns, rows } = d.grid
  let known: ReturnType<typeof relaxationOf> | null = null
  const step: LinearStep = {
    method: 'sor',
    stale: true,
    y: new Float64Array(columns * rows),
    lambda: 1,
    kernels: 'typescript',
    solve(matrix, rightHandSide, options) {
      if (step.stale || !known) known = relaxationOf(step, d, matrix)
      const { lambda, zones } = known
      const system = scaledSystem(matrix, rightHandSide, columns, rows)
      const outcome = relax(system, {
        target: options.target,
        headTolerance: options.headTolerance,
        lambda,
        zones,
        mostSweeps: options.mostIterations,
        weight: matrix.weight,
        watch: options.watch,
      })
      for (let cell = 0; cell < step.y.length; cell++) {
        step.y[cell] = (system.x[cell + columns] as number) / (system.root[cell] as number)
      }
      return {
        iterations: outcome.sweeps,
        residual: outcome.residual,
        headError: outcome.headError,
        ended: outcome.ended === 'sweeps' ? 'iterations' : outcome.ended,
      }
    },
  }
  return step
}

/**
 * The slowest mode's eigenvalue, and the zones whose levels are corrected by themselves. Where they are, what is left
 * for relaxation is not slower than a grid held on one side.
 */
function relaxationOf(
  step: LinearStep,
  d: Discretised,
  matrix: Matrix,
): { lambda: number; zones: Zones | null } {
  const { columns, rows } = d.grid
  const { lambda, mode } = slowestMode(matrix, columns, rows)
  step.lambda = lambda
  const slowest = 0.5 / Math.max(columns, rows) ** 2
  const free = (cell: number) => d.active[cell] === 1 && (d.fixedBy[cell] as number) < 0
  const nearlySingular = lambda < 0.05 * slowest
  const slow = matrix.symmetric && nearlySingular ? mode : null
  const zones = zonesOf(matrix, free, columns, rows, 0.3 * slowest, slow, nearlySingular)
  // Zones no slower than the rest are better left to relaxation, except where it is not symmetric and may stumble.
  const worth =
    !matrix.symmetric || nearlySingular || (zones && zones.slowest < 0.5 * Math.min(lambda, slowest))
  if (!zones || !worth) return { lambda, zones: null }
  return { lambda: Math.max(lambda, slowest), zones }
}

/** Conjugate gradients preconditioned by multigrid (linear/), or BiCGStab where the system is not symmetric. */
function multigrid(d: Discretised, kernels: Kernels | undefined): LinearStep {
  const { columns, rows } = d.grid
  const count = columns * rows
  let prepared: Prepared | null = null
  const rest = new Float64Array(count)
  const change = new Float64Array(count)
  const step: LinearStep = {
    method: 'multigrid',
    stale: true,
    y: new Float64Array(count),
    lambda: 1,
    kernels: kernels?.name ?? 'typescript',
    solve(matrix, rightHandSide, { target, headTolerance, mostIterations: most, watch }) {
      if (step.stale || !prepared) {
        prepared = prepareMultigrid(systemOf(matrix, columns, rows), kernels, prepared ?? undefined)
      }
      step.stale = false
      const { y } = step
      y.fill(0)
      let iterations = 0
      let wanted = target
      for (;;) {
        const options = {
          target: wanted,
          mostIterations: most - iterations,
          watch: (done: number, residual: number) => watch(iterations + done, residual),
        }
        const outcome = matrix.symmetric
          ? prepared.solve(rightHandSide, y, options)
          : solveUnsymmetric(
              (x, out) => applyMatrix(matrix, columns, rows, x, out),
              prepared,
              rightHandSide,
              y,
              options,
            )
        iterations += outcome.iterations
        if (headTolerance === Number.POSITIVE_INFINITY) {
          return { iterations, residual: outcome.residual, headError: Number.NaN, ended: outcome.ended }
        }
        // What one more cycle would still change tells what is left.
        applyMatrix(matrix, columns, rows, y, rest)
        for (let cell = 0; cell < count; cell++)
          rest[cell] = (rightHandSide[cell] as number) - (rest[cell] as number)
        prepared.precondition(rest, change)
        const { largest, range } = headChanges(y, change, matrix.weight)
        const headError = 2 * largest
        const settled = headError <= headTolerance * range || outcome.ended !== 'converged'
        if (settled || wanted < 1e-6 * target)
          return { iterations, residual: outcome.residual, headError, ended: outcome.ended }
        wanted *= 0.03
      }
    },
  }
  return step
}

/** Largest head change among `left`, and the range of head changes in `y`. */
function headChanges(
  y: Float64Array,
  left: Float64Array,
  weight: Float64Array,
): { largest: number; range: number } {
  let largest = 0
  let lowest = 0
  let highest = 0
  for (let cell = 0; cell < y.length; cell++) {
    const w = weight[cell] as number
    const value = (y[cell] as number) / w
    if (value < lowest) lowest = value
    if (value > highest) highest = value
    largest = Math.max(largest, Math.abs(left[cell] as number) / w)
  }
  return { largest, range: highest - lowest }
}

/** The matrix as a symmetric system: itself, or its symmetric part where it is not symmetric. */
function systemOf(matrix: Matrix, columns: number, rows: number): LinearSystem {
  const { west, east, south, north, corners, own, symmetric } = matrix
  const count = columns * rows
  function linksTo(forth: Float64Array, back: Float64Array, column: -1 | 0 | 1, row: 0 | 1): Float64Array {
    const links = new Float64Array(count)
    for (let j = 0; j < rows - row; j++) {
      for (let i = Math.max(0, -column); i < columns - Math.max(0, column); i++) {
        const cell = j * columns + i
        const other = cell + row * columns + column
        links[cell] = symmetric
          ? (forth[cell] as number)
          : 0.5 * ((forth[cell] as number) + (back[other] as number))
      }
    }
    return links
  }
  return {
    columns,
    rows,
    east: linksTo(east, west, 1, 0),
    north: linksTo(north, south, 0, 1),
    northEast: corners && linksTo(corners.northEast, corners.southWest, 1, 1),
    northWest: corners && linksTo(corners.northWest, corners.southEast, -1, 1),
    own: own.slice(),
  }
}

/** out = matrix x. Cells held or without ground have no links; there out = 0. */
function applyMatrix(
  matrix: Matrix,
  columns: number,
  rows: number,
  x: Float64Array,
  out: Float64Array,
): void {
  const { diag, west, east, south, north, corners, own, symmetric } = matrix
  for (let j = 0; j < rows; j++) {
    for (let i = 0; i < columns; i++) {
      const c = j * columns + i
      const w = i > 0 ? (west[c] as number) : 0
      const e = i < columns - 1 ? (east[c] as number) : 0
      const s = j > 0 ? (south[c] as number) : 0
      const n = j < rows - 1 ? (north[c] as number) : 0
      const mid = x[c] as number
      if (w + e + s + n + (own[c] as number) === 0 && !(corners && hasCornerLink(corners, c))) {
        out[c] = 0
        continue
      }
      // In symmetric systems the diagonal is the sum of all links: differences keep the digits that matter.
      const from = symmetric ? mid : 0
      let sum = symmetric ? (own[c] as number) * mid : (diag[c] as number) * mid
      if (w !== 0) sum += w * (from - (x[c - 1] as number))
      if (e !== 0) sum += e * (from - (x[c + 1] as number))
      if (s !== 0) sum += s * (from - (x[c - columns] as number))
      if (n !== 0) sum += n * (from - (x[c + columns] as number))
      out[c] = corners ? sum + cornersApplied(corners, columns, rows, i, j, x, from) : sum
    }
  }
}

function hasCornerLink(corners: CornerMatrix, c: number): boolean {
  const { southWest, southEast, northWest, northEast } = corners
  return southWest[c] !== 0 || southEast[c] !== 0 || northWest[c] !== 0 || northEast[c] !== 0
}

function cornersApplied(
  { southWest, southEast, northWest, northEast }: CornerMatrix,
  columns: number,
  rows: number,
  i: number,
  j: number,
  x: Float64Array,
  from: number,
): number {
  const c = j * columns + i
  let sum = 0
  if (j > 0 && i > 0) sum += (southWest[c] as number) * (from - (x[c - columns - 1] as number))
  if (j > 0 && i < columns - 1) sum += (southEast[c] as number) * (from - (x[c - columns + 1] as number))
  if (j < rows - 1 && i > 0) sum += (northWest[c] as number) * (from - (x[c + columns - 1] as number))
  if (j < rows - 1 && i < columns - 1)
    sum += (northEast[c] as number) * (from - (x[c + columns + 1] as number))
  return sum
}

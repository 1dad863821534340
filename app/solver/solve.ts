import { headsOut, resultOf } from './account'
import { balancerOf, type Progress, type SolverOptions } from './balancer'
import { type Discretised, discretise } from './discretise'
import type { Grid } from './grid'
import type { Method } from './linear-step'
import type { Model } from './model'
import { ModelError } from './model-error'
import { momentOf } from './moment'
import { checkPoints } from './points'
import { type Report, type RunRecord, recordOf } from './record'
import type { Result } from './result'
import { checkLinesAndRings } from './rings'
import { solveTransient } from './transient'
import { addWanted, checkWanted, type Pictures } from './wanted'

export type { Progress }

export interface SolveOptions extends SolverOptions {
  /** "sha256:…" of the model file, passed on into the result. */
  input?: string
  /** More cells are refused; only the largest grid of all is when left out. */
  mostCells?: number
}

/** Heads of the whole grid at one reported time. */
export interface HeadField {
  time: number
  heads: Float64Array
}

export interface Solution {
  result: Result
  /**
   * One head a cell, row by row from the lowest y, in the model's length and datum; NaN where there is no ground. In
   * transient flow those at the end.
   */
  heads: Float64Array
  /** Transient flow: the heads before the first step and at the end of every stage or reported step. Else empty. */
  fields: HeadField[]
  grid: Grid
  /** Fields for pictures that `want` asked for. */
  pictures: Pictures
  /** Stopped because `isCancelled` said so; the result is then as far as it came, and not converged. */
  cancelled: boolean
}

/** The tolerance on the true relative residual where the model file gives none. */
export const defaultTolerance = 1e-10

/**
 * Computes a model: one record with heads, convergence, balance and results by name. Throws ModelError (`path`,
 * `message`) for a model that is wrong or asks for what this version does not compute; anything else is a result,
 * with `converged` false when it did not get there.
 *
 * The model is laid out on its grid (discretise), where every cell has a balance: what flows through its faces
 * (flow), what its boundaries, wells and recharge bring, and what it stores. Newton's steps (newton) bring all
 * balances to zero; each is a linear system, solved by successive over-relaxation or multigrid (linear-step). In a
 * section with a free surface the set of wet cells is sought with them (section-balance, free-surface). Flows are then
 * added up by name (flow-field, moment), and the result written (account).
 */
export function solveModel(model: Model, options: SolveOptions = {}): Solution {
  const first = discretise(model)
  const cells = first.active.length
  if (options.mostCells !== undefined && cells > options.mostCells) {
    throw new ModelError(
      'grid',
      `${cells} cells are too many: at most ${options.mostCells} are computed here`,
    )
  }
  checkPoints(first)
  checkLinesAndRings(first)
  checkWanted(first)
  const run = runByMethod(model, first, options)
  const last = run.reports[run.reports.length - 1] as Report
  const result = resultOf(model, run)
  if (options.input !== undefined) result.input = options.input
  const solution: Solution = {
    result,
    heads: headsOut(last.d, last.outcome),
    fields: fieldsOf(run),
    grid: last.d.grid,
    pictures: {},
    cancelled: run.cancelled,
  }
  if (!run.cancelled) addWanted(model, run, solution, options, solveModel)
  return solution
}

/** 'automatic' takes multigrid, and falls back to relaxation where that does not get there. */
function runByMethod(model: Model, first: Discretised, options: SolverOptions): RunRecord {
  const asked = model.solver?.method ?? 'automatic'
  const run = runOf(model, first, asked === 'sor' ? 'sor' : 'multigrid', options)
  if (asked !== 'automatic' || run.converged || run.cancelled) return run
  const again = runOf(model, first, 'sor', options)
  return again.converged || again.residual < run.residual ? again : run
}

function runOf(model: Model, d: Discretised, method: Method, options: SolverOptions): RunRecord {
  const tolerance = model.solver?.tolerance ?? defaultTolerance
  if (model.time.kind === 'transient') return solveTransient(model, d, method, tolerance, options)
  const balancer = balancerOf(d, method, tolerance, options)
  const outcome = balancer.solve(null, null)
  const field = balancer.field(outcome, null)
  const reports = [{ time: 0, d, outcome, moment: momentOf(field) }]
  return { ...recordOf(outcome), reports, lastField: () => field }
}

function fieldsOf(run: RunRecord): HeadField[] {
  if (!run.initial) return []
  const start = run.reports[0] as Report
  return [
    { time: 0, heads: headsOut(start.d, run.initial) },
    ...run.reports.map(({ time, d, outcome }) => ({ time, heads: headsOut(d, outcome) })),
  ]
}

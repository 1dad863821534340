/**
 * Symmetric positive definite system on a grid of columns x rows cells. For each cell c = row * columns + column
 *
 *   sum over its links a (x_c - x_neighbour) + own_c x_c = b_c.
 *
 * Every array holds columns * rows numbers. A cell with no link and own 0 is not part of the system: its x stays as
 * given and its b is ignored.
 */
export interface LinearSystem {
  columns: number
  rows: number
  /** Link of cell c to c + 1; 0 in the last column. */
  east: Float64Array
  /** Link of cell c to c + columns; 0 in the last row. */
  north: Float64Array
  /** Link of cell c to c + columns + 1; null: none. Links to corners may be negative (oblique conductivity). */
  northEast: Float64Array | null
  /** Link of cell c to c + columns - 1; null: none. */
  northWest: Float64Array | null
  /** Links to what is held or known; >= 0. */
  own: Float64Array
}

export interface LinearOutcome {
  iterations: number
  /** Norm of b - A x, recomputed from its definition. */
  residual: number
  /** `stalled`: rounding leaves nothing to gain. `iterations`: the most that were allowed are done. */
  ended: 'converged' | 'stalled' | 'iterations' | 'cancelled'
  /** Estimate of the largest error left in x. */
  error: number
}

export interface LinearOptions {
  /** Norm of the true residual to reach. */
  target: number
  mostIterations: number
  /** Told after each iteration; true stops. */
  watch?: (iterations: number, residual: number) => boolean
}

/** A system made ready to be solved for any number of right-hand sides. */
export interface Prepared {
  /** Solves A x = b by conjugate gradients; `x` is the start and becomes the solution. */
  solve(b: Float64Array, x: Float64Array, options: LinearOptions): LinearOutcome
  /** z = M r, one symmetric multigrid cycle: a preconditioner for Krylov methods elsewhere. */
  precondition(r: Float64Array, z: Float64Array): void
  /** Memory held, in bytes. */
  bytes: number
}

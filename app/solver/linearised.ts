import type { Outcome } from './balancer'
import { emptyMatrix, evaluate, type FlowModel, type FlowState, type Matrix } from './flow'
import type { Kernels } from './linear/kernels'
import { linearStepOf } from './linear-step'
import type { Watch } from './newton'

/** The balance of the free cells linearised at a solution: A dh = extra inflow, A = -d(net inflow) / d(heads). */
export interface Linearised {
  /** Changes of head [length] for extra inflow [volume/time] into each cell; null when cancelled or not solved. */
  solve(inflow: Float64Array): Float64Array | null
  /** The same with the transposed matrix: what each cell's inflow is worth to a sum `weights` of heads. */
  solveTransposed(weights: Float64Array): Float64Array | null
}

export interface LinearisedOptions extends Watch {
  kernels?: Kernels
}

/** Linearises plan flow and saturated sections at a steady outcome. Rates of wells are held. */
export function linearisedAt({ flow, heads, rates }: Outcome, options: LinearisedOptions): Linearised {
  const { d } = flow
  const count = d.active.length
  const matrix = emptyMatrix(flow)
  const state: FlowState = { imbalance: new Float64Array(count), forcing: new Float64Array(count) }
  evaluate(flow, heads, rates, state, matrix)
  const forth = solverOf(flow, matrix, options)
  const back = matrix.symmetric ? forth : solverOf(flow, transposed(matrix, d.grid.columns, count), options)
  return {
    solve(inflow) {
      const y = forth(inflow)
      return y && divided(y, matrix.weight)
    },
    solveTransposed(weights) {
      // The unknown y is weight x dh, so the matrix of dh is the one at hand times the weights, column by column.
      return back(divided(weights, matrix.weight))
    },
  }
}

function solverOf(
  flow: FlowModel,
  matrix: Matrix,
  { kernels, isCancelled }: LinearisedOptions,
): (b: Float64Array) => Float64Array | null {
  const { d } = flow
  const step = linearStepOf('multigrid', d, { kernels })
  return (given) => {
    const b = given.slice()
    let norm = 0
    for (let cell = 0; cell < b.length; cell++) {
      if (d.active[cell] !== 1 || (d.fixedBy[cell] as number) >= 0) b[cell] = 0
      norm += (b[cell] as number) ** 2
    }
    if (norm === 0) return new Float64Array(b.length)
    const outcome = step.solve(matrix, b, {
      target: 1e-9 * Math.sqrt(norm),
      headTolerance: 1e-8,
      mostIterations: 2000,
      watch: () => isCancelled?.() ?? false,
    })
    if (outcome.ended === 'cancelled' || outcome.ended === 'iterations') return null
    return step.y.slice()
  }
}

function divided(values: Float64Array, by: Float64Array): Float64Array {
  return values.map((value, cell) => (value === 0 ? 0 : value / (by[cell] as number)))
}

/** Every link as its opposite one. */
function transposed(matrix: Matrix, columns: number, count: number): Matrix {
  function from(links: Float64Array, step: number): Float64Array {
    const moved = new Float64Array(count)
    for (let cell = 0; cell < count; cell++) {
      const other = cell + step
      if (other >= 0 && other < count) moved[cell] = links[other] as number
    }
    return moved
  }
  const { corners } = matrix
  return {
    ...matrix,
    west: from(matrix.east, -1),
    east: from(matrix.west, 1),
    south: from(matrix.north, -columns),
    north: from(matrix.south, columns),
    corners: corners && {
      southWest: from(corners.northEast, -columns - 1),
      southEast: from(corners.northWest, -columns + 1),
      northWest: from(corners.southEast, columns - 1),
      northEast: from(corners.southWest, columns + 1),
    },
  }
}

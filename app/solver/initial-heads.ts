import { balancerOf, type Outcome, type SolverOptions } from './balancer'
import { type Discretised, discretise } from './discretise'
import { flowModelOf } from './flow'
import type { Method } from './linear-step'
import type { Model, TransientTime } from './model'
import { ModelError, requireFinite } from './model-error'
import { knownLevels, modelOfStage } from './stages'

/**
 * The ground as a transient model finds it: given heads, or the steady heads of the first stage's boundaries and
 * recharge, with its wells or, "steady", without. `d` is the first stage on its grid. Throws ModelError for heads that
 * do not fit the grid.
 */
export function firstHeadsGiven(
  model: Model,
  d: Discretised,
  method: Method,
  tolerance: number,
  options: SolverOptions,
): Outcome {
  const { initialHead } = model.time as TransientTime
  if (initialHead === 'steady' || initialHead === 'steady with wells') {
    const still: Model = { ...modelOfStage(model, 0), time: { kind: 'steady' } }
    const start = discretise(still, 0, knownLevels(model))
    if (initialHead === 'steady') for (const well of start.wells) well.requested = 0
    return balancerOf(start, method, tolerance, options).solve(null, null)
  }
  const count = d.active.length
  const heads = new Float64Array(count)
  if (typeof initialHead === 'number') {
    heads.fill(requireFinite(initialHead, 'time.initialHead') - d.reference)
  } else {
    if (initialHead.length !== count) {
      throw new ModelError('time.initialHead', `has ${initialHead.length} values for ${count} cells`)
    }
    for (let cell = 0; cell < count; cell++) {
      const head = initialHead[cell]
      if (head === null || head === undefined) {
        if (d.active[cell] === 1) {
          throw new ModelError(`time.initialHead[${cell}]`, 'is null where there is ground')
        }
        continue
      }
      heads[cell] = requireFinite(head, `time.initialHead[${cell}]`) - d.reference
    }
  }
  return {
    flow: flowModelOf(d),
    heads,
    saturation: null,
    rates: d.wells.map(() => 0),
    converged: true,
    cancelled: false,
    atRoundingFloor: false,
    method,
    kernels: '',
    iterations: 0,
    residual: 0,
    headError: 0,
    unresolvedFlow: 0,
    history: [],
  }
}

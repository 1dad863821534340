import type { Discretised } from './discretise'
import {
  evaluate,
  type FlowModel,
  type FlowState,
  headAfter,
  type Matrix,
  normOfFree,
  type StorageTerm,
} from './flow'
import type { LinearStep } from './linear-step'

export interface Progress {
  /** Sweeps of relaxation or cycles of multigrid so far. */
  iterations: number
  residual: number
  percent: number
  phase: string
}

export interface Watch {
  onProgress?: (progress: Progress) => void
  isCancelled?: () => boolean
}

/** The balance of every cell of one model on its way to being met, and the memory for it. */
export interface Balancing {
  d: Discretised
  flow: FlowModel
  step: LinearStep
  matrix: Matrix
  state: FlowState
  trial: FlowState
  /** Above the reference; what is solved for. */
  heads: Float64Array
  trialHeads: Float64Array
  /** Flow of each well into the ground. */
  rates: number[]
  /** Storage over the step in time; null: steady. */
  storage: StorageTerm | null
  tolerance: number
  /** What the residual is relative to: volume/time. */
  rightHandSide: number
  iterations: number
  mostIterations: number
  history: { iterations: number; residual: number }[]
  first: number
  cancelled: boolean
  /** Stopped where rounding lets the residual fall no further. */
  atRoundingFloor: boolean
  headError: number
  residual: number
  watch: Watch
  phase: string
}

const mostSteps = 60

/**
 * A fresh balance with the given heads to start from, held cells set to their heads. `matrix` is that of the last
 * balance that `step` knows, as long as the step is not stale.
 */
export function balancingOf(
  flow: FlowModel,
  step: LinearStep,
  matrix: Matrix,
  heads: Float64Array,
  tolerance: number,
  mostIterations: number,
  watch: Watch,
): Balancing {
  const { d } = flow
  const count = d.active.length
  const emptyState = (): FlowState => ({
    imbalance: new Float64Array(count),
    forcing: new Float64Array(count),
  })
  for (let cell = 0; cell < count; cell++) {
    if ((d.fixedBy[cell] as number) >= 0) heads[cell] = d.fixedHead[cell] as number
  }
  return {
    d,
    flow,
    step,
    matrix,
    state: emptyState(),
    trial: emptyState(),
    heads,
    trialHeads: new Float64Array(count),
    rates: d.wells.map((well) => well.requested),
    storage: null,
    tolerance,
    rightHandSide: 0,
    iterations: 0,
    mostIterations,
    history: [],
    first: 0,
    cancelled: false,
    atRoundingFloor: false,
    headError: 0,
    residual: 0,
    watch,
    phase: 'heads',
  }
}

/**
 * Newton's steps on the balance of every cell, each solved by the method at hand, until the true residual of the whole
 * system is within the tolerance: relative to what does not balance at the start in linear flow, to all that enters
 * and leaves cells otherwise. Linear models need one step; a flat unconfined base is linear in the unknown that is
 * used and needs few. False when it did not get there. A residual that rounding keeps above the tolerance counts as
 * there if the estimated head error is below 1e-6 of the range of heads; so does what rounding alone can leave where
 * next to nothing flows, relative to what it can resolve.
 */
export function balanceCells(run: Balancing): boolean {
  const { d, flow, state, step } = run
  let before = Number.POSITIVE_INFINITY
  let idleSteps = 0
  for (let newton = 0; newton < mostSteps; newton++) {
    const renew = step.stale || !flow.linear
    if (renew) step.stale = true
    evaluate(flow, run.heads, run.rates, state, renew ? run.matrix : null, run.storage)
    const norm = normOfFree(d, state.imbalance)
    if (!flow.linear) run.rightHandSide = normOfFree(d, state.forcing)
    else if (run.rightHandSide === 0) run.rightHandSide = Math.max(norm, normOfFree(d, state.forcing))
    run.residual = run.rightHandSide > 0 ? norm / run.rightHandSide : 0
    if (newton === 0 && run.first === 0) run.first = run.residual
    if (norm === 0 || (newton > 0 && run.residual <= run.tolerance)) {
      note(run, run.residual)
      return true
    }
    // Below the tolerance's reach a step no longer helps: what is left is rounding.
    idleSteps = run.residual > 0.5 * before ? idleSteps + 1 : 0
    if (idleSteps >= 2) {
      const rounding = roundingOf(run)
      if (norm <= rounding) {
        run.rightHandSide = Math.max(run.rightHandSide, rounding / run.tolerance)
        run.residual = norm / run.rightHandSide
        note(run, run.residual)
        return true
      }
    }
    if (idleSteps >= (flow.linear ? 2 : 8)) {
      run.atRoundingFloor = run.residual < 1e-6
      if (step.method === 'sor') run.headError = largestChange(run) / step.lambda
      return run.atRoundingFloor && run.headError <= 1e-6 * headSpread(run)
    }
    before = Math.min(before, run.residual)
    const full = 0.3 * run.tolerance * run.rightHandSide
    clearHeld(d, state.imbalance)
    const start = run.iterations
    const outcome = step.solve(run.matrix, state.imbalance, {
      target: flow.linear ? full : Math.max(full, 1e-5 * norm),
      headTolerance: flow.linear ? headToleranceOf(step, run.tolerance) : 1e-4,
      mostIterations: run.mostIterations - start,
      watch: (iterations, residual) => {
        run.iterations = start + iterations
        note(run, residual / run.rightHandSide)
        run.cancelled = run.watch.isCancelled?.() ?? false
        return run.cancelled
      },
    })
    run.iterations = start + outcome.iterations
    run.headError = outcome.headError
    takeStep(run, norm)
    if (outcome.ended === 'cancelled' || run.iterations >= run.mostIterations) break
  }
  evaluate(flow, run.heads, run.rates, state, null, run.storage)
  run.residual = run.rightHandSide > 0 ? normOfFree(d, state.imbalance) / run.rightHandSide : 0
  return !run.cancelled && run.residual <= run.tolerance
}

/**
 * The share of the range of heads that a head may be wrong by: what multigrid's next cycle would change is some
 * times less than what is wrong, while relaxation's estimate is a hundred times too high.
 */
function headToleranceOf(step: LinearStep, tolerance: number): number {
  return step.method === 'sor' ? 1e-8 : Math.max(0.3 * tolerance, 1e-13)
}

/**
 * What rounding alone may leave of the balance, where what flows is so little that the tolerance asks for less: as
 * ground comes to rest. Each cell's flows and stored volume are differences of numbers as large as its diagonal times
 * its head and thickness.
 */
function roundingOf({ d, matrix, heads }: Balancing): number {
  let sum = 0
  for (let c = 0; c < heads.length; c++) {
    if (d.active[c] !== 1 || (d.fixedBy[c] as number) >= 0) continue
    const weight = matrix.weight[c] as number
    const level = Math.abs(heads[c] as number) + (d.unconfined ? weight : 0)
    sum += ((matrix.diag[c] as number) * weight * level) ** 2
  }
  return 8 * Number.EPSILON * Math.sqrt(sum)
}

/** Largest change of head that would balance a cell by itself. */
function largestChange(run: Balancing): number {
  const { d, matrix, state } = run
  let largest = 0
  for (let c = 0; c < d.active.length; c++) {
    if (d.active[c] !== 1 || (d.fixedBy[c] as number) >= 0) continue
    const change =
      (state.imbalance[c] as number) / ((matrix.diag[c] as number) * (matrix.weight[c] as number))
    largest = Math.max(largest, Math.abs(change))
  }
  return largest
}

function clearHeld(d: Discretised, imbalance: Float64Array): void {
  for (let cell = 0; cell < imbalance.length; cell++) {
    if (d.active[cell] !== 1 || (d.fixedBy[cell] as number) >= 0) imbalance[cell] = 0
  }
}

/** Applies the step, halved while it makes the balance worse (never in linear flow, where it cannot). */
function takeStep(run: Balancing, norm: number): void {
  const { d, flow, heads, trialHeads, step } = run
  let share = 1
  for (let attempt = 0; attempt < 8; attempt++) {
    for (let cell = 0; cell < heads.length; cell++) {
      const h = heads[cell] as number
      const free = d.active[cell] === 1 && (d.fixedBy[cell] as number) < 0
      const next = free ? headAfter(flow, cell, h, share * (step.y[cell] as number)) : h
      trialHeads[cell] = run.storage && d.unconfined ? stoppedAtBend(flow, cell, h, next) : next
    }
    if (flow.linear) break
    // In confined flow what bends does so between straight lines, where whole steps are known to arrive.
    if (d.unconfined) stopAtLevels(flow, heads, trialHeads)
    evaluate(flow, trialHeads, run.rates, run.trial, null, run.storage)
    if (normOfFree(d, run.trial.imbalance) < (1 - 0.1 * share) * norm) break
    share /= 2
  }
  heads.set(trialHeads)
}

/**
 * A full cell stores hundreds of times less than one that has a water table, a dry one less still. A step taken by the
 * slope on one side of such a bend overshoots on the other; so it stops just past it, and the next one knows better.
 */
function stoppedAtBend({ d, storage, film }: FlowModel, cell: number, h: number, next: number): number {
  const { profile } = storage[d.profileOf[cell] as number] as FlowModel['storage'][number]
  const base = profile.base[0] as number
  const top = profile.top[profile.top.length - 1] as number
  if (h >= top && next < top) return Math.max(next, top - 1e-9 * (top - base))
  if (h < base + film && next > base + film) return Math.min(next, base + 2 * film)
  return next
}

/**
 * Beside a drain's level, or the level below which a river no longer draws more, the flow bends, and a step that knows
 * one side only overshoots. A head that crosses such a level stops just above it, where the flow still answers to the
 * head; one that stood there already goes on.
 */
function stopAtLevels({ d, bends }: FlowModel, heads: Float64Array, trialHeads: Float64Array): void {
  for (const { cell, level } of bends) {
    if ((d.fixedBy[cell] as number) >= 0) continue
    const hair = 1e-9 * Math.max(d.headRange, Math.abs(level), 1e-3)
    const h = heads[cell] as number
    const next = trialHeads[cell] as number
    const crosses = (h < level && next > level) || (h > level + 2 * hair && next < level)
    if (crosses) trialHeads[cell] = level + hair
  }
}

function headSpread({ d, heads }: Balancing): number {
  let lowest = Number.POSITIVE_INFINITY
  let highest = Number.NEGATIVE_INFINITY
  for (let cell = 0; cell < heads.length; cell++) {
    if (d.active[cell] !== 1) continue
    lowest = Math.min(lowest, heads[cell] as number)
    highest = Math.max(highest, heads[cell] as number)
  }
  return highest - lowest
}

function note(run: Balancing, residual: number): void {
  run.history.push({ iterations: run.iterations, residual })
  if (!run.watch.onProgress) return
  const whole = Math.log(Math.max(run.first, run.tolerance * 10) / run.tolerance)
  const done = Math.log(Math.max(run.first, run.tolerance * 10) / Math.max(residual, run.tolerance))
  run.watch.onProgress({
    iterations: run.iterations,
    residual,
    percent: Math.round(100 * Math.min(1, Math.max(0, done / whole))),
    phase: run.phase,
  })
}

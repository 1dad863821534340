import { type Balancer, balancerOf, type Outcome, type SolverOptions, thinned } from './balancer'
import { type Discretised, discretise } from './discretise'
import type { StorageTerm } from './flow'
import { firstHeadsGiven } from './initial-heads'
import type { Method } from './linear-step'
import type { Model, Stage, TransientTime } from './model'
import { ModelError } from './model-error'
import { type Moment, momentOf, type Totals, totalsOf, weighted, weightedTotals } from './moment'
import { type RunRecord, recordOf } from './record'
import { checkStages } from './stages'

/**
 * Steps in time by the singly diagonally implicit Runge-Kutta method of two stages, stiffly accurate and L-stable, of
 * second order (Alexander 1977, SIAM J. Numer. Anal. 14, 1006): with g = 1 - 1/root 2 and V the stored volume,
 *
 *   V(h1) - V(h0) = g dt F(h1),   V(h2) - V(h0) = (1 - g) dt F(h1) + g dt F(h2),
 *
 * so that a step's water balance is exact with the flows (1 - g) F(h1) + g F(h2).
 */
export const gamma = 1 - Math.SQRT1_2

/** The most steps that a run may take. */
const mostSteps = 20_000

/** Default growth of steps, and their number in a stage whose first step is not given. */
const defaultGrowth = 1.2
const defaultSteps = 30

/**
 * Carries the heads of a transient model through all its stages, the first laid out already. Stops early, with
 * `converged` false, where a step fails.
 */
export function solveTransient(
  model: Model,
  firstStage: Discretised,
  method: Method,
  tolerance: number,
  options: SolverOptions,
): RunRecord {
  const time = model.time as TransientTime
  checkStages(time.stages)
  checkSteps(time.stages)
  const whole = time.stages.reduce((sum, stage) => sum + stage.duration, 0)
  // Every stage is laid out before the first is computed, so that a mistake in the last one is found at once.
  const stages = time.stages.map((_, stage) => (stage === 0 ? firstStage : discretise(model, stage)))
  const progress = { done: 0, iterations: 0 }
  const watch: SolverOptions = {
    ...options,
    onProgress: options.onProgress
      ? (one) =>
          options.onProgress?.({
            ...one,
            iterations: progress.iterations + one.iterations,
            percent: Math.floor((100 * progress.done) / whole),
          })
      : undefined,
  }
  const initial = firstHeadsGiven(model, firstStage, method, tolerance, watch)
  const all: RunRecord = {
    ...recordOf(initial),
    initial,
    unresolvedFlow: 0,
  }
  let state = initial
  let before = 0
  for (const [number, stage] of time.stages.entries()) {
    if (!all.converged) break
    const balancer = balancerOf(stages[number] as Discretised, method, tolerance, watch)
    const volumes: Totals = { inflow: 0, outflow: 0, storage: 0 }
    const control = stepControl(stage)
    let done = 0
    let earlier: { heads: Float64Array; dt: number }[] = []
    while (done < stage.duration && all.converged) {
      const dt = control.next(stage.duration - done)
      const end = stage.duration - done - dt <= 1e-12 * stage.duration
      const step = options.halveSteps ? twoSteps : oneStep
      const taken = step(balancer, state, dt, end || time.report === 'steps')
      progress.iterations = all.iterations + taken.iterations
      const error = control.automatic ? thirdDifference(taken.second.heads, state.heads, earlier, dt) : 0
      if (taken.converged && control.automatic && !control.accept(error, dt, spreadOf(taken.second))) {
        all.iterations += taken.iterations
        continue
      }
      note(all, taken)
      if (!taken.converged) break
      done = end ? stage.duration : done + dt
      progress.done = before + done
      volumes.inflow += dt * taken.totals.inflow
      volumes.outflow += dt * taken.totals.outflow
      volumes.storage += dt * taken.totals.storage
      earlier = [{ heads: state.heads, dt }, ...earlier].slice(0, 2)
      state = taken.second
      if (taken.moment) {
        all.reports.push({ time: before + done, d: balancer.d, outcome: state, moment: taken.moment })
      }
      all.lastField = () => balancer.field(taken.second, taken.secondTerm)
      if (all.steps >= mostSteps) all.converged = false
    }
    all.volumes.push(volumes)
    before += stage.duration
  }
  if (all.reports.length === 0) {
    const field = balancerOf(firstStage, method, tolerance, watch).field(state, null)
    all.reports.push({ time: 0, d: firstStage, outcome: state, moment: momentOf(field) })
    all.lastField = () => field
  }
  all.history = thinned(all.history)
  return all
}

/** Refuses stages that given steps would take too long to get through. */
function checkSteps(stages: Stage[]): void {
  let steps = 0
  for (const [index, stage] of stages.entries()) {
    const control = stepControl(stage)
    for (let left = stage.duration; left > 1e-12 * stage.duration && !control.automatic; steps++) {
      if (steps >= mostSteps) {
        throw new ModelError(
          `time.stages[${index}]`,
          `its steps are too small: all stages together may take ${mostSteps}, and more lead only part of the way`,
        )
      }
      left -= control.next(left)
    }
  }
}

function note(all: RunRecord, taken: Taken): void {
  all.steps++
  all.iterations += taken.iterations
  all.residual = Math.max(all.residual, taken.residual)
  all.headError += taken.headError
  all.unresolvedFlow = Math.max(all.unresolvedFlow, taken.unresolvedFlow)
  all.converged = taken.converged
  all.cancelled = taken.cancelled
  all.atRoundingFloor ||= taken.second.atRoundingFloor
  all.kernels = taken.second.kernels
  all.history.push({ iterations: all.iterations, residual: taken.residual })
}

interface Taken {
  second: Outcome
  secondTerm: StorageTerm
  totals: Totals
  moment: Moment | null
  iterations: number
  residual: number
  headError: number
  unresolvedFlow: number
  converged: boolean
  cancelled: boolean
}

/** One step; `reported`: are its flows wanted by name? */
function oneStep(balancer: Balancer, state: Outcome, dt: number, reported: boolean): Taken {
  const stored = balancer.stored(state)
  const firstTerm: StorageTerm = { interval: gamma * dt, before: stored }
  const first = balancer.solve(state, firstTerm)
  const afterFirst = balancer.stored(first)
  const share = (1 - gamma) / gamma
  const from = stored.map((volume, cell) => volume + share * ((afterFirst[cell] as number) - volume))
  const secondTerm: StorageTerm = { interval: gamma * dt, before: from }
  const second = first.converged ? balancer.solve(first, secondTerm) : first
  const fields = [balancer.field(first, firstTerm), balancer.field(second, secondTerm)] as const
  return {
    second,
    secondTerm,
    totals: weightedTotals(1 - gamma, totalsOf(fields[0]), gamma, totalsOf(fields[1])),
    moment: reported ? weighted(1 - gamma, momentOf(fields[0]), gamma, momentOf(fields[1])) : null,
    iterations: first.iterations + (second === first ? 0 : second.iterations),
    residual: Math.max(first.residual, second.residual),
    headError: Math.max(first.headError, second.headError),
    unresolvedFlow: Math.max(first.unresolvedFlow, second.unresolvedFlow),
    converged: first.converged && second.converged,
    cancelled: first.cancelled || second.cancelled,
  }
}

/** Two steps of half the length, as one. */
function twoSteps(balancer: Balancer, state: Outcome, dt: number, reported: boolean): Taken {
  const one = oneStep(balancer, state, dt / 2, reported)
  if (!one.converged) return one
  const other = oneStep(balancer, one.second, dt / 2, reported)
  return {
    ...other,
    totals: weightedTotals(0.5, one.totals, 0.5, other.totals),
    moment: one.moment && other.moment && weighted(0.5, one.moment, 0.5, other.moment),
    iterations: one.iterations + other.iterations,
    residual: Math.max(one.residual, other.residual),
    headError: one.headError + other.headError,
    unresolvedFlow: Math.max(one.unresolvedFlow, other.unresolvedFlow),
  }
}

interface StepControl {
  automatic: boolean
  /** The next step, which ends exactly with the stage when little is left. */
  next: (left: number) => number
  /** Automatic steps: is the step's error small enough? Sets the step to come either way. */
  accept: (error: number, dt: number, spread: number) => boolean
}

/** Share of the range of heads that one automatic step may be wrong by. */
const stepTolerance = 1e-4

function stepControl(stage: Stage): StepControl {
  const growth = stage.growth ?? defaultGrowth
  const even = growth === 1 ? defaultSteps : (growth ** defaultSteps - 1) / (growth - 1)
  const automatic = stage.steps === 'automatic'
  const largest = stage.largestStep ?? Number.POSITIVE_INFINITY
  let step = Math.min(stage.firstStep ?? stage.duration / (automatic ? 1e4 : even), largest)
  let first = true
  return {
    automatic,
    next(left) {
      if (!first && !automatic) step = Math.min(step * growth, largest)
      first = false
      if (step >= left * (1 - 1e-9)) return left
      return Math.min(step, 0.5 * left)
    },
    accept(error, dt, spread) {
      const allowed = stepTolerance * spread
      const factor = error > 0 && allowed > 0 ? 0.8 * (allowed / error) ** (1 / 3) : 2
      const good = error <= allowed || dt <= 1e-9 * stage.duration
      step = Math.min(dt * Math.min(good ? 2 : 0.7, Math.max(0.2, factor)), largest)
      return good
    },
  }
}

/**
 * Estimate of one step's error from how the heads of the last steps bend: the method's error constant times the
 * third divided difference times 6 dt^3. Before there are three steps the second difference stands in, which is more.
 */
function thirdDifference(
  now: Float64Array,
  before: Float64Array,
  earlier: { heads: Float64Array; dt: number }[],
  dt: number,
): number {
  const [one, two] = earlier
  let largest = 0
  for (let cell = 0; cell < now.length; cell++) {
    const slope = ((now[cell] as number) - (before[cell] as number)) / dt
    if (!one) {
      largest = Math.max(largest, 0.1 * Math.abs(slope) * dt)
      continue
    }
    const slopeBefore = ((before[cell] as number) - (one.heads[cell] as number)) / one.dt
    const second = (slope - slopeBefore) / (dt + one.dt)
    if (!two) {
      largest = Math.max(largest, 0.1 * Math.abs(second) * dt * dt)
      continue
    }
    const slopeEarlier = ((one.heads[cell] as number) - (two.heads[cell] as number)) / two.dt
    const secondBefore = (slopeBefore - slopeEarlier) / (one.dt + two.dt)
    const third = (second - secondBefore) / (dt + one.dt + two.dt)
    largest = Math.max(largest, errorConstant * 6 * Math.abs(third) * dt ** 3)
  }
  return largest
}

/** For y' = q y the method's local error is this times (q dt)^3: 1/6 less the third term of its stability function. */
const errorConstant = Math.abs(1 / 6 - 3 * gamma ** 2 + 2 * gamma ** 3)

function spreadOf({ heads, flow }: Outcome): number {
  const { d } = flow
  let lowest = Number.POSITIVE_INFINITY
  let highest = Number.NEGATIVE_INFINITY
  for (let cell = 0; cell < heads.length; cell++) {
    if (d.active[cell] !== 1) continue
    lowest = Math.min(lowest, heads[cell] as number)
    highest = Math.max(highest, heads[cell] as number)
  }
  return Math.max(highest - lowest, d.headRange)
}

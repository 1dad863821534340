import type { Discretised } from './discretise'
import {
  emptyMatrix,
  type FlowModel,
  flowModelOf,
  type ProfileFlow,
  type StorageTerm,
  storedVolumes,
} from './flow'
import { type FlowField, planField } from './flow-field'
import { freeSurfaceBalancer } from './free-surface'
import {
  type LinearStep,
  type LinearStepOptions,
  linearStepOf,
  type Method,
  mostIterations,
} from './linear-step'
import { type Balancing, balanceCells, balancingOf, type Progress, type Watch } from './newton'
import { reduceWells } from './reduced-wells'

export type { Progress }

export interface SolverOptions extends Watch, LinearStepOptions {
  /** Takes every step in time as two of half its length. */
  halveSteps?: boolean
}

/** How far iterations came, and with what. */
export interface Convergence {
  converged: boolean
  cancelled: boolean
  /** Stopped where rounding lets the residual fall no further. */
  atRoundingFloor: boolean
  method: Method
  /** What did the arithmetic: 'typescript' or the name of compiled kernels. */
  kernels: string
  iterations: number
  /** Of several steps in time the largest. */
  residual: number
  /** Estimate of the largest error of any head left by stopping here; over several steps in time their sum. */
  headError: number
  /** Flows below this are within what the residual leaves open: volume/time. */
  unresolvedFlow: number
  history: { iterations: number; residual: number }[]
}

/** Heads that balance, and how far they do. */
export interface Outcome extends Convergence {
  flow: FlowModel
  /** Above the reference. */
  heads: Float64Array
  /** Share of each cell's pores that is full; null: wherever there is ground (plan flow and saturated sections). */
  saturation: Float64Array | null
  /** Flow of each well into the ground, as achieved. */
  rates: number[]
}

/** Balances the cells of one stage, in steady flow or over steps in time, in memory that it keeps. */
export interface Balancer {
  d: Discretised
  /** Heads that balance every cell, starting from `start`; with `storage`, over one implicit step in time. */
  solve(start: Outcome | null, storage: StorageTerm | null): Outcome
  /** Water stored in every cell, from an arbitrary zero: volume. */
  stored(outcome: Outcome): Float64Array
  /** Every flow of an outcome. */
  field(outcome: Outcome, storage: StorageTerm | null): FlowField
}

/**
 * The balancer of a model: that of sections with a free surface, or Newton's steps by one method. Wells that a cell cannot supply, or
 * that would fall below their lowest level, are reduced. Always returns, with `converged` said.
 */
export function balancerOf(
  d: Discretised,
  method: Method,
  tolerance: number,
  options: SolverOptions,
): Balancer {
  if (d.model.flow === 'free surface') return freeSurfaceBalancer(d, method, tolerance, options)
  const flow = flowModelOf(d)
  const step = linearStepOf(method, d, options)
  const matrix = emptyMatrix(flow)
  const most = mostIterations(method, d.active.length)
  let interval = 0
  return {
    d,
    solve(start, storage) {
      if ((storage?.interval ?? 0) !== interval) step.stale = true
      interval = storage?.interval ?? 0
      const heads = start ? start.heads.slice() : firstHeads(flow)
      const run = balancingOf(flow, step, matrix, heads, tolerance, most, options)
      run.storage = storage
      const converged = balanceCells(run) && reduceWells(run)
      return outcomeOf(run, step, converged)
    },
    stored: (outcome) => storedVolumes(flow, outcome.heads),
    field: (outcome, storage) => planField(flow, outcome.heads, outcome.rates, storage),
  }
}

function outcomeOf(run: Balancing, step: LinearStep, converged: boolean): Outcome {
  const { flow, heads, rates, cancelled, atRoundingFloor, iterations, residual, headError } = run
  return {
    flow,
    heads,
    saturation: null,
    rates,
    converged,
    cancelled,
    atRoundingFloor,
    method: step.method,
    kernels: step.kernels,
    iterations,
    residual,
    headError,
    unresolvedFlow: converged ? Math.sqrt(heads.length) * Math.max(residual, 1e-15) * run.rightHandSide : 0,
    history: thinned(run.history),
  }
}

function firstHeads(flow: FlowModel): Float64Array {
  const { d } = flow
  const heads = new Float64Array(d.active.length)
  if (!d.unconfined) return heads
  for (let cell = 0; cell < heads.length; cell++) {
    if (d.active[cell] !== 1) continue
    // Starting wet: Newton's steps come down to the surface more surely than they climb to it.
    const { base } = flow.flows[d.profileOf[cell] as number] as ProfileFlow
    heads[cell] = Math.max(d.highestHead, base + Math.max(1e4 * flow.film, 0.05 * (d.highestHead - base)))
  }
  return heads
}

/** At most a few hundred entries, the last one kept. */
export function thinned<Entry>(history: Entry[]): Entry[] {
  const step = Math.ceil(history.length / 300)
  return history.filter((_, index) => index % step === 0 || index === history.length - 1)
}

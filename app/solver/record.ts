import type { Convergence, Outcome } from './balancer'
import type { Discretised } from './discretise'
import type { FlowField } from './flow-field'
import type { Moment, Totals } from './moment'

/** The ground at the end of a reported step, with the flows over that step; in steady flow, the steady state. */
export interface Report {
  /** From time zero to the end of the step; 0 in steady flow. */
  time: number
  d: Discretised
  outcome: Outcome
  moment: Moment
}

/** What one run of a model computed and how well, steady or through its stages. */
export interface RunRecord extends Convergence {
  /** The ground before the first step; null in steady flow. */
  initial: Outcome | null
  /** At least one. */
  reports: Report[]
  /** Volumes by stage; empty in steady flow. */
  volumes: Totals[]
  /** Steps in time. */
  steps: number
  /** Every flow of the last report; null before there is one. */
  lastField: (() => FlowField) | null
}

/** The record of one outcome, without reports. */
export function recordOf(outcome: Outcome): RunRecord {
  const { converged, cancelled, atRoundingFloor, method, kernels } = outcome
  const { iterations, residual, headError, unresolvedFlow, history } = outcome
  return {
    initial: null,
    reports: [],
    volumes: [],
    steps: 0,
    converged,
    cancelled,
    atRoundingFloor,
    method,
    kernels,
    iterations,
    residual,
    headError,
    unresolvedFlow,
    history: [...history],
    lastField: null,
  }
}

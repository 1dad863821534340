export type RunState = 'queued' | 'running' | 'done' | 'failed' | 'cancelled' | 'interrupted'

/** How far a solve is, as its thread last said. */
export interface SolveProgress {
  /** What the solver is doing, in words. */
  phase?: string
  /** 0 to 100. */
  percent?: number
  /** Sweeps over the grid so far. */
  iterations?: number
  /** True residual relative to the right-hand side. */
  residual?: number | null
}

/** One line of the list of runs. */
export interface RunLine {
  id: number
  number: number
  caseId: string
  caseName: string
  state: RunState
  converged: boolean | null
  /** Water-balance error in percent of the inflow. */
  errorPercent: number | null
  inputSha256: string
  engine: string | null
  error: string | null
  createdAt: string
  endedAt: string | null
  by: string
  /** True when the case, computed as the book stands now, would have another input. */
  stale: boolean
}

/** State of a run as pages poll it. */
export interface RunStatus {
  id: number
  number: number
  caseName: string
  state: RunState
  converged: boolean | null
  progress: SolveProgress | null
  error: string | null
}

/** Head at a named point, in metres whatever the project shows; null with the reason where there is none. */
export interface RunPoint {
  pointId: string
  name: string
  x: number
  y: number
  head: number | null
  why: string | null
}

export function underWay(state: RunState): boolean {
  return state === 'queued' || state === 'running'
}

/** First and last figures of a SHA-256, enough to tell two inputs apart at a glance. */
export function shortHash(sha256: string): string {
  return `${sha256.slice(0, 8)}…${sha256.slice(-4)}`
}

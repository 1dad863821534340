/** The result, version 1, as the model file's description gives it. Steady results hold one entry a list. */

export interface Warning {
  code: string
  /** 'note': for information. 'check': look before using the result. 'serious': the result is not to be used as it is. */
  severity: 'note' | 'check' | 'serious'
  text: string
}

export interface PointResult {
  name: string
  /** null: no head here; `why` says so. */
  head: (number | null)[]
  why?: string
}

export interface WellResult {
  name: string
  /** Rates are positive, whatever the well's kind. */
  requested: number[]
  achieved: number[]
  cellHead: number[]
  /** null without a radius, or where the well would be dry. */
  wellHead: (number | null)[]
}

/** Flow into and out of the model, both positive. */
export interface NamedFlow {
  name: string
  inflow: number[]
  outflow: number[]
}

export interface KindFlow {
  kind: 'fixed head' | 'specified flux' | 'head-dependent flux' | 'drain' | 'recharge' | 'wells' | 'leakage'
  inflow: number[]
  outflow: number[]
}

export interface RingResult {
  name: string
  area: number
  through: number[]
  recharge: number[]
  wells: number[]
  leakage: number[]
  boundaries: number[]
  storage: number[]
  error: number[]
}

export interface Balance {
  inflow: number[]
  outflow: number[]
  storage: number[]
  errorPercent: number[]
  kinds: KindFlow[]
}

export interface Result {
  format: 'lavant-result'
  version: 1
  engine: string
  /** "sha256:…" of the model file, where the caller gave it. */
  input?: string
  converged: boolean
  method: 'sor'
  /** Sweeps over the grid. */
  iterations: number
  /** True residual relative to the right-hand side. */
  residual: number
  grid: { columns: number; rows: number; cells: number; active: number }
  times: number[]
  points: PointResult[]
  wells: WellResult[]
  lines: { name: string; discharge: number[] }[]
  rings: RingResult[]
  boundaries: NamedFlow[]
  recharge: NamedFlow[]
  leakage: NamedFlow[]
  balance: Balance
  noFlowEdges: string[]
  warnings: Warning[]
  /** The relative residual after each number of sweeps, at most a few hundred entries. */
  history: { sweeps: number; residual: number }[]
  /** Largest error left in any head by stopping here, as the convergence observed lets one estimate it; length. */
  headError: number
}

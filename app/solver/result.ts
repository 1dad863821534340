/** The result, version 1, as the model file's description gives it. Lists hold one entry a reported time, one when steady. */

export interface Warning {
  code: string
  /** 'note': for information. 'check': look before using the result. 'serious': the result is not to be used as it is. */
  severity: 'note' | 'check' | 'serious'
  text: string
  /** The result may be issued only once somebody has accepted this, with a reason. */
  accept?: true
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
  kind:
    | 'fixed head'
    | 'specified flux'
    | 'head-dependent flux'
    | 'drain'
    | 'seepage face'
    | 'recharge'
    | 'wells'
    | 'leakage'
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
  /** Cumulative by stage, in transient flow: volumes. */
  volumes?: { inflow: number[]; outflow: number[]; storage: number[] }
  /** The cell that balances worst: its centre and what it gains too much, volume/time. */
  worstCell: { at: [x: number, y: number]; error: number }[]
}

export interface Result {
  format: 'lavant-result'
  version: 1
  engine: string
  /** "sha256:…" of the model file, where the caller gave it. */
  input?: string
  converged: boolean
  /** Successive over-relaxation, or conjugate gradients preconditioned by multigrid. */
  method: 'sor' | 'multigrid'
  /** What did the arithmetic: 'typescript', or the name of the compiled kernels. */
  kernels: string
  /** Sweeps over the grid (SOR) or iterations of conjugate gradients, over all steps. */
  iterations: number
  /** True residual relative to the right-hand side; in transient flow the largest of all steps. */
  residual: number
  /** Steps in time, in transient flow. */
  steps?: number
  grid: { columns: number; rows: number; cells: number; active: number }
  /** End of each stage, or of each step, from time zero; empty in steady flow. */
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
  /** The relative residual after each number of iterations, at most a few hundred entries. */
  history: { iterations: number; residual: number }[]
  /** Largest error left in any head by stopping here, as the convergence observed lets one estimate it; length. */
  headError: number
  /** What `want` asked for. Of transient flow, flow lines and capture zones are those of the last reported moment. */
  flowLines?: FlowLineResult[]
  captureZones?: CaptureResult
}

/** What a flow line ended at. Against the flow that is where its water came from. */
export interface FlowLineEnd {
  /** 'edge': an outer edge that no boundary names. 'time': the time asked for. 'limit': too many cells. */
  at: 'well' | 'boundary' | 'leakage' | 'recharge' | 'stagnation' | 'dry ground' | 'edge' | 'time' | 'limit'
  name?: string
}

export interface FlowLineResult {
  direction: 'forward' | 'back'
  /** The well it was started round. */
  well?: string
  line: [x: number, y: number][]
  /** At each vertex, from the start, whatever the direction. */
  times: number[]
  /** The last of them. */
  time: number
  ended: FlowLineEnd
  /** Wells whose cells the line passed, because they take less than what flows through. */
  passed?: string[]
}

/** The ground from which a well draws within a time; null: ever. */
export interface CaptureZone {
  time: number | null
  area: number
  outline: [x: number, y: number][]
}

export interface CaptureResult {
  /** Where the water of the site goes: the area that drains there, and its share of all ground looked at. */
  drains: (FlowLineEnd & { area: number; share: number })[]
  /** Every abstraction well that gives water, with its zone within each time asked for and, last, without limit. */
  wells: { name: string; zones: CaptureZone[] }[]
  /** The places looked at: one for `cells` x `cells` cells. */
  raster: { columns: number; rows: number; cells: number }
}

/** A formula that holds for the whole model, beside the results. */
export interface FormulaComparison {
  name: string
  source: string
  /** The most that the model's finite extent may change a head by. */
  extentEffect: number
  /** By named result, one value a time; difference = computed - formula. */
  results: { name: string; formula: (number | null)[]; difference: (number | null)[] }[]
}

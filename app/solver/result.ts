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
  band?: Band[]
}

export interface WellResult {
  name: string
  /** Rates are positive, whatever the well's kind. */
  requested: number[]
  achieved: number[]
  cellHead: number[]
  /** null without a radius, or where the well would be dry. */
  wellHead: (number | null)[]
  /** Of the head at the well face, or of the cell's without a radius. */
  band?: Band[]
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
  /** Of the flow through it. */
  band?: Band[]
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
  lines: { name: string; discharge: number[]; band?: Band[] }[]
  rings: RingResult[]
  boundaries: NamedFlow[]
  recharge: NamedFlow[]
  leakage: NamedFlow[]
  balance: Balance
  noFlowEdges: string[]
  /** Vertical sections with a free surface: its elevation in the columns that have one, at the end. */
  freeSurface?: FreeSurfacePoint[]
  /** Vertical sections: how high water leaves at every seepage face, at the end. */
  seepageFaces?: SeepageFaceResult[]
  /** Vertical sections: gradients along every boundary where water leaves, at the end. */
  gradients?: GradientResult[]
  warnings: Warning[]
  /** The relative residual after each number of iterations, at most a few hundred entries. */
  history: { iterations: number; residual: number }[]
  /** Largest error left in any head by stopping here, as the convergence observed lets one estimate it; length. */
  headError: number
  /** What `want` asked for. Of transient flow, flow lines and capture zones are those of the last reported moment. */
  flowLines?: FlowLineResult[]
  captureZones?: CaptureResult
  verification?: Verification
  responses?: ResponseResult[]
  sensitivities?: SensitivityResult[]
  drawdown?: DrawdownResult
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

/** Where a share of a well's water comes from. */
export interface CaptureSource extends FlowLineEnd {
  share: number
}

export interface CaptureResult {
  /** Where the water of the site goes: the area that drains there, and its share of all ground looked at. */
  drains: (FlowLineEnd & { area: number; share: number })[]
  /**
   * Every abstraction well that gives water: where that comes from, and the ground it draws on within each time asked
   * for and, last, without limit.
   */
  wells: { name: string; sources: CaptureSource[]; zones: CaptureZone[] }[]
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

/** The interval that a value lies in by the verification of its run; null where there is nothing to judge it by. */
export type Band = [low: number, high: number] | null

/** One try at other outer boundaries; `done`: computed. */
export interface SwapResult {
  text: string
  done: boolean
}

/** What the verification found about one named result; lists have one entry a reported time. */
export interface VerifiedResult {
  name: string
  band: Band[]
  /** Observed order of convergence with the cell size. */
  order: (number | null)[]
  /** Richardson's extrapolation to cells of no size. */
  extrapolated: (number | null)[]
  /** How the grid's error was estimated: see convergence.ts. */
  how: ('observed order' | 'limited order' | 'first order assumed' | 'none')[]
  /** Estimated errors, safety factor included. */
  gridError: (number | null)[]
  timeError?: (number | null)[]
  /** The value with other outer boundaries. */
  swapped: { text: string; values: (number | null)[] }[]
}

export interface Verification {
  /** Finest first; `times`: cell size against the model's own. */
  grid: { grids: { columns: number; rows: number; cells: number; times: number }[]; why: string }
  /** Null in steady flow. */
  time: { halved: boolean; why?: string } | null
  outerBoundary: SwapResult[]
  formula: FormulaComparison | null
  results: VerifiedResult[]
}

export interface FreeSurfacePoint {
  /** The middle of a column. */
  x: number
  elevation: number
}

export interface SeepageFaceResult {
  name: string
  /** null: no water leaves. */
  exitElevation: number | null
}

/** The gradient at which water leaves the ground through one boundary of a vertical section. */
export interface GradientResult {
  /** Of the boundary. */
  name: string
  /** Head lost over `overDepth` below the boundary, a length of it: the mean over the place that is worst, or stated. */
  mean: number
  overDepth: number
  /** The steepest between a face and the centre of its cell, and where. */
  localMaximum: number
  at: [x: number, y: number]
  /** From that face to that centre twice: what the local maximum depends on. */
  cellSize: number
  /** The maximum stands beside a corner or a wall's end where it grows without limit as cells shrink. */
  singular: boolean
  /** Of the mean. */
  band?: Band[]
}

/** Change of every named result for one more unit of a well's rate. */
export interface ResponseResult {
  well: string
  /** The rate is water taken out, or put in. */
  per: 'abstraction' | 'recharge'
  results: { name: string; change: number | null }[]
}

/** How a named result changes with what the model assumes; of small changes, all else held. */
export interface SensitivityResult {
  name: string
  value: number | null
  /** With ln K (both principal conductivities together), and with kx at the same ratio. */
  materials: { name: string; perLnK: number; perK: number }[]
  recharge: { name: string; perRate: number }[]
  /** With the head or level, ln of the conductance, or flux, all along the boundary. */
  boundaries: { name: string; perHead?: number; perLnConductance?: number; perFlux?: number }[]
  /** With ln k; 0 where k = 0. */
  walls: { name: string; perLnK: number }[]
  leakage: { name: string; perHead: number; perLnLeakance: number }[]
  /** With the rate, positive as the file gives it. */
  wells: { name: string; perRate: number }[]
}

/** Heads with all wells off less those of the run, one a reported time. */
export interface DrawdownResult {
  points: { name: string; drawdown: (number | null)[] }[]
  /** At the well face where the well has a radius, else in its cells. */
  wells: { name: string; drawdown: (number | null)[] }[]
}

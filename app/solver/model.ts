/**
 * The model file, version 1, as TypeScript sees it. All numbers are in the model's own units (`units`); a field that
 * may be left out is optional here too, and nothing fills it in: the parsed model is the file, so its hash is the
 * file's hash.
 */

export type Position = [x: number, y: number]

/** One value, one a vertex of the line, or one a stage; which of them holds depends on the row (see the model file). */
export type StageValue = number | number[]
export interface ByStage {
  stages: StageValue[]
}
export type Value = StageValue | ByStage

export interface Surface {
  xyz: [x: number, y: number, z: number][]
}

export interface UniformGrid {
  columns: number
  rows: number
}
export interface GivenGrid {
  xEdges: number[]
  yEdges: number[]
}
export interface PlannedGrid {
  cellSize: number
  refine?: { x: number; y: number; cellSize: number }[]
}

export interface Stage {
  name?: string
  duration: number
  firstStep?: number
  growth?: number
  largestStep?: number
  steps?: 'automatic'
}

export interface SteadyTime {
  kind: 'steady'
}
export interface TransientTime {
  kind: 'transient'
  initialHead: number | (number | null)[] | 'steady' | 'steady with wells'
  report?: 'stages' | 'steps'
  stages: Stage[]
}

export interface Material {
  name: string
  kx: number
  ky: number
  angle?: number
  specificStorage?: number
  specificYield?: number
  porosity?: number
  source?: string
}

export interface Layer {
  material: string
  base?: number | Surface
  top?: number | Surface
  source?: string
}

export interface Ground {
  polygon?: Position[]
  material?: string
  base?: number | Surface
  top?: number | Surface
  layers?: Layer[]
  source?: string
}

export interface Well {
  name: string
  x: number
  y: number
  kind: 'abstraction' | 'recharge'
  rate: Value
  radius?: number
  lowestLevel?: number
  /** Levels between which the well is open; plan. Not given: over the whole saturated thickness. */
  screen?: { top: number; bottom: number }
  source?: string
}

export interface Recharge {
  name: string
  polygon?: Position[]
  rate: Value
  source?: string
}

interface BoundaryPlace {
  name: string
  line?: Position[]
  polygon?: Position[]
  outer?: boolean
  source?: string
}
export interface FixedHead extends BoundaryPlace {
  kind: 'fixed head'
  head: Value
}
export interface SpecifiedFlux extends BoundaryPlace {
  kind: 'specified flux'
  flux: Value
}
export interface HeadDependentFlux extends BoundaryPlace {
  kind: 'head-dependent flux'
  head: Value
  conductance: Value
  disconnectsBelow?: Value
}
export interface Drain extends BoundaryPlace {
  kind: 'drain'
  level: Value
  conductance: Value
}
export interface SeepageFace extends BoundaryPlace {
  kind: 'seepage face'
}
export type Boundary = FixedHead | SpecifiedFlux | HeadDependentFlux | Drain | SeepageFace

export interface Wall {
  name: string
  line: Position[]
  thickness: number
  k: number
  /** Level of its lower end; plan. Not given: at the base of the ground or below. */
  toe?: number
  source?: string
}

export interface Leakage {
  name: string
  polygon?: Position[]
  head: Value
  leakance: number
  source?: string
}

export interface Point {
  name: string
  x: number
  y: number
  side?: 'left' | 'right'
  source?: string
}

export interface DischargeLine {
  name: string
  line: Position[]
  source?: string
}

export interface Ring {
  name: string
  polygon: Position[]
  source?: string
}

/** A flow line from a place, or `lines` of them (16) that carry equal shares of a well's water, starting round it. */
export type FlowLineWish =
  | { from: Position; direction: 'forward' | 'back' }
  | { well: string; direction: 'forward' | 'back'; lines?: number }

export interface Want {
  verify?: boolean
  /** Names of results: "points/P1", "wells/W1", "lines/Base of dig", "rings/Site/through". */
  sensitivities?: string[]
  responses?: boolean
  flowLines?: FlowLineWish[]
  /** Which ground drains to which well, within each of the times [time] and without limit. */
  captureZones?: { times?: number[] }
  /** Heads compared with those of the same case with all wells off. */
  drawdown?: boolean
}

export interface Model {
  format: 'lavant-model'
  version: 1
  title?: string
  place?: { crs?: string; origin?: Position; verticalDatum?: string }
  start?: string
  units: { length: 'm' | 'ft'; time: 's' | 'd' }
  kind: 'plan' | 'section'
  flow: 'confined' | 'unconfined' | 'saturated' | 'free surface'
  extent: { x: [number, number]; y: [number, number] }
  grid: UniformGrid | GivenGrid | PlannedGrid
  time: SteadyTime | TransientTime
  materials: Material[]
  ground: Ground[]
  wells?: Well[]
  recharge?: Recharge[]
  boundaries?: Boundary[]
  walls?: Wall[]
  leakage?: Leakage[]
  points?: Point[]
  lines?: DischargeLine[]
  rings?: Ring[]
  solver?: { method?: 'automatic' | 'sor' | 'multigrid'; tolerance?: number }
  want?: Want
}

import { solveDense } from './dense'
import type { Discretised } from './discretise'
import {
  emptyMatrix,
  evaluate,
  type FlowModel,
  type FlowState,
  flowModelOf,
  headAfter,
  type Matrix,
  normOfFree,
  type ProfileFlow,
} from './flow'
import { levelOfPotential, potentialAt, slopeAt } from './saturated'
import { relax, scaledSystem, slowestMode } from './sor'
import { logEquivalentRadius, type PlacedWell } from './wells'
import { type Zones, zonesOf } from './zones'

export interface Progress {
  sweeps: number
  residual: number
  percent: number
  phase: string
}

export interface SteadyOptions {
  onProgress?: (progress: Progress) => void
  isCancelled?: () => boolean
}

export interface SteadyOutcome {
  flow: FlowModel
  /** Above the reference. */
  heads: Float64Array
  /** Flow of each well into the ground, as achieved. */
  rates: number[]
  state: FlowState
  converged: boolean
  cancelled: boolean
  /** Stopped where rounding lets the residual fall no further. */
  atRoundingFloor: boolean
  sweeps: number
  residual: number
  headError: number
  /** Flows below this are within what the residual leaves open: volume/time. */
  unresolvedFlow: number
  history: { sweeps: number; residual: number }[]
}

const mostSweeps = 60_000
const mostCellUpdates = 2e11
const mostSteps = 60

interface Run {
  d: Discretised
  flow: FlowModel
  matrix: Matrix
  state: FlowState
  trial: FlowState
  heads: Float64Array
  trialHeads: Float64Array
  rates: number[]
  tolerance: number
  rightHandSide: number
  sweeps: number
  allowed: number
  history: { sweeps: number; residual: number }[]
  first: number
  cancelled: boolean
  atFloor: boolean
  headError: number
  /** Smallest eigenvalue, as last estimated. */
  lambda: number
  residual: number
  options: SteadyOptions
  phase: string
}

/**
 * Steady heads: Newton's steps on the balance of every cell, each solved by successive over-relaxation. Linear models
 * need one step; a flat unconfined base is linear in the unknown that is used and needs as few. Wells that a cell
 * cannot supply, or that would fall below their lowest level, are reduced. Always returns, with `converged` said.
 */
export function solveSteady(d: Discretised, tolerance: number, options: SteadyOptions): SteadyOutcome {
  const flow = flowModelOf(d)
  const count = d.active.length
  const emptyState = (): FlowState => ({
    imbalance: new Float64Array(count),
    forcing: new Float64Array(count),
  })
  const run: Run = {
    d,
    flow,
    matrix: emptyMatrix(flow),
    state: emptyState(),
    trial: emptyState(),
    heads: firstHeads(flow),
    trialHeads: new Float64Array(count),
    rates: d.wells.map((well) => well.requested),
    tolerance,
    rightHandSide: 0,
    sweeps: 0,
    allowed: Math.min(mostSweeps, Math.max(200, Math.floor(mostCellUpdates / count))),
    history: [],
    first: 0,
    cancelled: false,
    atFloor: false,
    headError: 0,
    lambda: 1,
    residual: 0,
    options,
    phase: 'heads',
  }
  let converged = balanceCells(run)
  if (converged) converged = reduceWells(run)
  return {
    flow,
    heads: run.heads,
    rates: run.rates,
    state: run.state,
    converged,
    cancelled: run.cancelled,
    atRoundingFloor: run.atFloor,
    sweeps: run.sweeps,
    residual: run.residual,
    headError: run.headError,
    unresolvedFlow: converged ? Math.sqrt(count) * Math.max(run.residual, 1e-15) * run.rightHandSide : 0,
    history: thinned(run.history),
  }
}

function firstHeads(flow: FlowModel): Float64Array {
  const { d } = flow
  const heads = new Float64Array(d.active.length)
  for (let cell = 0; cell < heads.length; cell++) {
    if (d.active[cell] !== 1) continue
    if ((d.fixedBy[cell] as number) >= 0) heads[cell] = d.fixedHead[cell] as number
    else if (d.unconfined) {
      // Starting wet: Newton's steps come down to the surface more surely than they climb to it.
      const { base } = flow.flows[d.profileOf[cell] as number] as ProfileFlow
      heads[cell] = Math.max(d.highestHead, base + Math.max(1e4 * flow.film, 0.05 * (d.highestHead - base)))
    }
  }
  return heads
}

function balanceCells(run: Run): boolean {
  const { d, flow, state } = run
  const { columns, rows } = d.grid
  let before = Number.POSITIVE_INFINITY
  let idleSteps = 0
  for (let step = 0; step < mostSteps; step++) {
    evaluate(flow, run.heads, run.rates, state, run.matrix)
    const norm = normOfFree(d, state.imbalance)
    // Linear: the right-hand side is what does not balance at the reference head. Otherwise: all that enters and leaves.
    if (d.unconfined) run.rightHandSide = normOfFree(d, state.forcing)
    else if (run.rightHandSide === 0) run.rightHandSide = Math.max(norm, normOfFree(d, state.forcing))
    run.residual = run.rightHandSide > 0 ? norm / run.rightHandSide : 0
    if (step === 0 && run.first === 0) run.first = run.residual
    if (norm === 0 || (step > 0 && run.residual <= run.tolerance)) {
      note(run, run.residual)
      return true
    }
    // Below the tolerance's reach a step no longer helps: what is left is rounding.
    idleSteps = run.residual > 0.5 * before ? idleSteps + 1 : 0
    if (idleSteps >= (flow.linear ? 2 : 8)) {
      run.atFloor = run.residual < 1e-6
      run.headError = largestChange(run) / run.lambda
      return run.atFloor && run.headError <= 1e-6 * headSpread(run)
    }
    before = Math.min(before, run.residual)
    const { lambda, zones } = relaxationOf(run)
    const full = 0.3 * run.tolerance * run.rightHandSide
    const target = flow.linear ? full : Math.max(full, 1e-5 * norm)
    const system = scaledSystem(run.matrix, state.imbalance, columns, rows)
    clearHeld(d, system.b)
    const start = run.sweeps
    const outcome = relax(system, {
      target,
      headTolerance: flow.linear ? 1e-8 : 1e-4,
      lambda,
      zones,
      mostSweeps: run.allowed - start,
      weight: run.matrix.weight,
      watch: (sweeps, residual) => {
        run.sweeps = start + sweeps
        note(run, residual / run.rightHandSide)
        run.cancelled = run.options.isCancelled?.() ?? false
        return run.cancelled
      },
    })
    run.sweeps = start + outcome.sweeps
    run.headError = outcome.headError
    takeStep(run, system.x, system.root, norm)
    if (outcome.ended === 'cancelled' || run.sweeps >= run.allowed) break
  }
  evaluate(flow, run.heads, run.rates, state, null)
  run.residual = run.rightHandSide > 0 ? normOfFree(d, state.imbalance) / run.rightHandSide : 0
  return !run.cancelled && run.residual <= run.tolerance
}

/**
 * The slowest mode's eigenvalue, and the zones whose levels are corrected by themselves. Where they are, what is left
 * for relaxation is not slower than a grid held on one side.
 */
function relaxationOf(run: Run): { lambda: number; zones: Zones | null } {
  const { d, matrix } = run
  const { columns, rows } = d.grid
  const { lambda, mode } = slowestMode(matrix, columns, rows)
  run.lambda = lambda
  const slowest = 0.5 / Math.max(columns, rows) ** 2
  const free = (cell: number) => d.active[cell] === 1 && (d.fixedBy[cell] as number) < 0
  const nearlySingular = lambda < 0.05 * slowest
  const slow = matrix.symmetric && nearlySingular ? mode : null
  const zones = zonesOf(matrix, free, columns, rows, 0.3 * slowest, slow, nearlySingular)
  // Zones no slower than the rest are better left to relaxation, except where it is not symmetric and may stumble.
  const worth =
    !matrix.symmetric || nearlySingular || (zones && zones.slowest < 0.5 * Math.min(lambda, slowest))
  if (!zones || !worth) return { lambda, zones: null }
  return { lambda: Math.max(lambda, slowest), zones }
}

/** Largest change of head that would balance a cell by itself. */
function largestChange(run: Run): number {
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

function clearHeld(d: Discretised, b: Float64Array): void {
  for (let cell = 0; cell < b.length; cell++) {
    if (d.active[cell] !== 1 || (d.fixedBy[cell] as number) >= 0) b[cell] = 0
  }
}

/** Applies the step, halved while it makes the balance worse (never in linear flow, where it cannot). */
function takeStep(run: Run, x: Float64Array, root: Float64Array, norm: number): void {
  const { d, flow, heads, trialHeads } = run
  const { columns } = d.grid
  let share = 1
  for (let attempt = 0; attempt < 8; attempt++) {
    for (let cell = 0; cell < heads.length; cell++) {
      const h = heads[cell] as number
      const free = d.active[cell] === 1 && (d.fixedBy[cell] as number) < 0
      const change = (share * (x[cell + columns] as number)) / (root[cell] as number)
      trialHeads[cell] = free ? headAfter(flow, cell, h, change) : h
    }
    if (flow.linear) break
    evaluate(flow, trialHeads, run.rates, run.trial, null)
    if (normOfFree(d, run.trial.imbalance) < (1 - 0.1 * share) * norm) break
    share /= 2
  }
  heads.set(trialHeads)
}

function headSpread(run: Run): number {
  let lowest = Number.POSITIVE_INFINITY
  let highest = Number.NEGATIVE_INFINITY
  for (let cell = 0; cell < run.heads.length; cell++) {
    if (run.d.active[cell] !== 1) continue
    lowest = Math.min(lowest, run.heads[cell] as number)
    highest = Math.max(highest, run.heads[cell] as number)
  }
  return highest - lowest
}

function note(run: Run, residual: number): void {
  run.history.push({ sweeps: run.sweeps, residual })
  if (!run.options.onProgress) return
  const whole = Math.log(Math.max(run.first, run.tolerance * 10) / run.tolerance)
  const done = Math.log(Math.max(run.first, run.tolerance * 10) / Math.max(residual, run.tolerance))
  run.options.onProgress({
    sweeps: run.sweeps,
    residual,
    percent: Math.round(100 * Math.min(1, Math.max(0, done / whole))),
    phase: run.phase,
  })
}

function thinned(history: { sweeps: number; residual: number }[]): { sweeps: number; residual: number }[] {
  const step = Math.ceil(history.length / 300)
  return history.filter((_, index) => index % step === 0 || index === history.length - 1)
}

/** Geometric mean of the transmissivities along x and y at a cell; what a well in it meets. */
function wellTransmissivity(flow: FlowModel, cell: number, h: number): number {
  const profile = flow.d.profileOf[cell] as number
  if (!flow.d.unconfined) return Math.sqrt((flow.fullX[profile] as number) * (flow.fullY[profile] as number))
  const { x, y } = flow.flows[profile] as ProfileFlow
  return Math.sqrt(slopeAt(x, h) * slopeAt(y, h))
}

/** The conductivities' geometric mean a layer, as a discharge potential: unconfined flow to a well. */
function wellPotential(flow: FlowModel, cell: number) {
  const { x, y } = flow.flows[flow.d.profileOf[cell] as number] as ProfileFlow
  return {
    profile: x.profile,
    film: x.film,
    k: x.k.map((kx, layer) => Math.sqrt(kx * (y.k[layer] as number))),
  }
}

/** ln(equivalent radius / well radius), or 0 without a radius. */
function logRadii(flow: FlowModel, well: PlacedWell, heads: Float64Array): number {
  if (well.radius === 0) return 0
  const { grid } = flow.d
  const places = well.shares.map(({ cell, weight }) => {
    const row = Math.floor(cell / grid.columns)
    return { column: cell - row * grid.columns, row, weight }
  })
  function spacing(edges: Float64Array, indices: number[]): number {
    const low = Math.min(...indices)
    const high = Math.max(...indices)
    if (low === high) return (edges[low + 1] as number) - (edges[low] as number)
    return ((edges[high + 1] as number) - (edges[low] as number)) / 2
  }
  const dx = spacing(
    grid.xEdges,
    places.map((place) => place.column),
  )
  const dy = spacing(
    grid.yEdges,
    places.map((place) => place.row),
  )
  const main = mainCell(well)
  const profile = flow.d.profileOf[main] as number
  const potentials = flow.flows[profile]
  const anisotropy = potentials
    ? slopeAt(potentials.x, heads[main] as number) / slopeAt(potentials.y, heads[main] as number)
    : (flow.fullX[profile] as number) / (flow.fullY[profile] as number)
  return logEquivalentRadius(places, dx, dy, anisotropy) - Math.log(well.radius)
}

function mainCell(well: PlacedWell): number {
  let main = well.shares[0] as PlacedWell['shares'][number]
  for (const share of well.shares) if (share.weight > main.weight) main = share
  return main.cell
}

/** The weighted mean of the heads of the cells that share the well. */
export function cellHeadOf(well: PlacedWell, heads: Float64Array): number {
  return well.shares.reduce((sum, { cell, weight }) => sum + weight * (heads[cell] as number), 0)
}

/** Head at the well face by the equivalent radius (Peaceman 1978, 1983); null without a radius or when dry. */
export function wellHeadOf(
  flow: FlowModel,
  well: PlacedWell,
  rate: number,
  heads: Float64Array,
): number | null {
  if (well.radius === 0) return null
  const loss = (rate * logRadii(flow, well, heads)) / (2 * Math.PI)
  const main = mainCell(well)
  if (!flow.d.unconfined) return cellHeadOf(well, heads) + loss / wellTransmissivity(flow, main, 0)
  const potential = wellPotential(flow, main)
  const value = well.shares.reduce(
    (sum, { cell, weight }) => sum + weight * potentialAt(potential, heads[cell] as number),
    loss,
  )
  const level = levelOfPotential(potential, value)
  return level > (potential.profile.base[0] as number) + 2 * flow.film ? level : null
}

/** The lowest level a well may have: its own, and 1 % of the thickness above the base in unconfined ground. */
export function lowestLevelOf(flow: FlowModel, well: PlacedWell): number {
  if (!flow.d.unconfined) return well.lowestLevel
  return Math.max(well.lowestLevel, yieldLevel(flow, mainCell(well)))
}

/** Below this a cell of unconfined ground yields nothing to a well: 1 % of its thickness at the highest known level. */
function yieldLevel(flow: FlowModel, cell: number): number {
  const { base } = flow.flows[flow.d.profileOf[cell] as number] as ProfileFlow
  return base + 0.01 * Math.max(flow.d.highestHead - base, 0)
}

/**
 * How far, in discharge potential, a well stands above its lowest level: nearly linear in its rate. In unconfined
 * ground none of the cells that share it may fall dry either; `cell` is the one that decides then, else -1.
 */
function clearance(
  flow: FlowModel,
  well: PlacedWell,
  rate: number,
  heads: Float64Array,
): { above: number; cell: number } {
  const loss = (rate * logRadii(flow, well, heads)) / (2 * Math.PI)
  const limit = lowestLevelOf(flow, well)
  const main = mainCell(well)
  if (!flow.d.unconfined) {
    return { above: wellTransmissivity(flow, main, 0) * (cellHeadOf(well, heads) - limit) + loss, cell: -1 }
  }
  const potential = wellPotential(flow, main)
  let decides = {
    above: well.shares.reduce(
      (sum, share) => sum + share.weight * potentialAt(potential, heads[share.cell] as number),
      loss - potentialAt(potential, limit),
    ),
    cell: -1,
  }
  for (const { cell } of well.shares) {
    const own = wellPotential(flow, cell)
    const above = potentialAt(own, heads[cell] as number) - potentialAt(own, yieldLevel(flow, cell))
    if (above < decides.above) decides = { above, cell }
  }
  return decides
}

/**
 * Reduces abstraction wells that stand below their lowest level until they stand on it. The response of the levels to
 * the rates comes from one solve a well on the system at hand; a few rounds settle what is not linear.
 */
function reduceWells(run: Run): boolean {
  const { d, flow } = run
  const wells = d.wells
  const limited = new Set<number>()
  let response: number[][] = []
  let stale = true
  for (let round = 0; round < 40; round++) {
    const scale = (w: number) => {
      const well = wells[w] as PlacedWell
      const above = Math.abs(d.highestHead - lowestLevelOf(flow, well))
      return wellTransmissivity(flow, mainCell(well), d.highestHead) * Math.max(above, 1e-6)
    }
    const below = wells.map(
      (well, w) => clearance(flow, well, run.rates[w] as number, run.heads).above / scale(w),
    )
    for (const [w, well] of wells.entries()) {
      if (well.requested < 0 && !limited.has(w) && (below[w] as number) < -1e-9) {
        limited.add(w)
        stale = true
      }
    }
    const open = [...limited]
    const off = open.filter((w) => {
      const rate = run.rates[w] as number
      const gap = below[w] as number
      // A well that is off already and still too low, or back at its full rate and high enough, has settled.
      if (gap < -1e-8 && rate < 0) return true
      return gap > 1e-8 && rate > (wells[w] as PlacedWell).requested
    })
    if (off.length === 0) return true
    run.phase = 'wells that cannot give their rate'
    if (stale || !flow.linear) response = open.map((w) => responseOf(run, w, open))
    stale = false
    const wanted = open.map(
      (w) => -clearance(flow, wells[w] as PlacedWell, run.rates[w] as number, run.heads).above,
    )
    const changes = solveDense(
      open.map((_, a) => open.map((__, b) => (response[b] as number[])[a] as number)),
      wanted,
    )
    open.forEach((w, index) => {
      const requested = (wells[w] as PlacedWell).requested
      const next = (run.rates[w] as number) + (changes[index] as number)
      run.rates[w] = Math.min(0, Math.max(requested, next))
    })
    if (run.cancelled || !balanceCells(run)) return false
  }
  return false
}

/** Change of every limited well's clearance for one more unit of flow into the ground at well `source`. */
function responseOf(run: Run, source: number, open: number[]): number[] {
  const { d, flow } = run
  const { columns, rows } = d.grid
  evaluate(flow, run.heads, run.rates, run.trial, run.matrix)
  const unit = new Float64Array(d.active.length)
  for (const { cell, weight } of (d.wells[source] as PlacedWell).shares) {
    if ((d.fixedBy[cell] as number) < 0) unit[cell] = weight
  }
  const { lambda, zones } = relaxationOf(run)
  const weight = run.matrix.weight.slice()
  const system = scaledSystem(run.matrix, unit, columns, rows)
  const start = run.sweeps
  relax(system, {
    target: 1e-8,
    headTolerance: 1e-6,
    lambda,
    zones,
    mostSweeps: run.allowed,
    weight,
    watch: (sweeps) => {
      run.sweeps = start + sweeps
      run.cancelled = run.options.isCancelled?.() ?? false
      return run.cancelled
    },
  })
  const rise = (cell: number) => {
    const y = (system.x[cell + columns] as number) / (system.root[cell] as number)
    return (wellTransmissivity(flow, cell, run.heads[cell] as number) * y) / (weight[cell] as number)
  }
  return open.map((w) => {
    const well = d.wells[w] as PlacedWell
    const decides = clearance(flow, well, run.rates[w] as number, run.heads).cell
    if (decides >= 0) return rise(decides)
    const change = well.shares.reduce((sum, share) => sum + share.weight * rise(share.cell), 0)
    return change + (w === source ? logRadii(flow, well, run.heads) / (2 * Math.PI) : 0)
  })
}

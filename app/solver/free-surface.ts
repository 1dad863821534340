import type { Balancer, Outcome, SolverOptions } from './balancer'
import type { Discretised } from './discretise'
import { emptyMatrix, type FlowModel, flowModelOf, type Matrix, type StorageTerm } from './flow'
import { flexibleMinimalResiduals } from './krylov'
import { type LinearStep, linearStepOf, type Method, mostIterations } from './linear-step'
import {
  netInflow,
  type SectionBalance,
  type SectionState,
  sectionBalanceOf,
  sectionStateOf,
  sectionStored,
  termFlow,
} from './section-balance'
import { sectionField } from './section-field'

/** Changes of the wet set; each is one linear solve. */
const mostChanges = 200

/** After so many changes that leave as many cells to switch as before, draining and filling take turns, more coarsely. */
const patience = 12

/** Steps of minimal residuals between two looks at the wet set: each keeps two numbers a cell. */
function stepsAtOnce(cells: number): number {
  return Math.min(30, Math.max(6, Math.floor(3e7 / cells)))
}

/**
 * The balancer of vertical sections with a free surface. It looks for the set of wet cells: with a set given, the
 * pressure heads in it and the water that falls through the rest follow from linear equations; then cells whose
 * pressure head came out negative are let drain, and cells that more water reaches than can fall through them are
 * filled (a semi-smooth Newton method; Hintermueller, Ito & Kunisch 2003). Starts from `start`, or from full ground.
 */
export function freeSurfaceBalancer(
  d: Discretised,
  method: Method,
  tolerance: number,
  options: SolverOptions,
): Balancer {
  const flow = flowModelOf(d)
  const balance = sectionBalanceOf(d)
  const wet = new Uint8Array(d.active.length)
  const step = linearStepOf(method, { ...d, active: wet }, options)
  return {
    d,
    solve(start, storage) {
      const run = searchOf(balance, flow, step, wet, start, storage, tolerance, options)
      return outcomeOf(run, flow, findWetSet(run))
    },
    stored: (outcome) => sectionStored(balance, stateOf(balance, outcome)),
    field: (outcome, storage) => sectionField(balance, stateOf(balance, outcome), storage),
  }
}

function stateOf(balance: SectionBalance, { heads, saturation }: Outcome): SectionState {
  return sectionStateOf(balance, heads, saturation)
}

/** What is searched for and the memory for it. Arrays hold one number a cell. */
interface Search {
  balance: SectionBalance
  step: LinearStep
  matrix: Matrix
  /** Has the linear solver to be set up anew for the wet set? */
  stale: boolean
  storage: StorageTerm | null
  tolerance: number
  options: SolverOptions
  /** 1: wet and free, with a pressure head to be found. Held cells and cells that drain: 0. */
  wet: Uint8Array
  state: SectionState
  /** By cell: what its terms bring at p = 0 and how that falls with p, while they act as they do now. */
  given: Float64Array
  slope: Float64Array
  /** What a full cell lets flow on, and what a cell gets that depends on nothing, from storage too. */
  lets: Float64Array
  gets: Float64Array
  imbalance: Float64Array
  /** What the residual is relative to. */
  rightHandSide: number
  /** What rounding alone may leave of the residual's norm: stored volumes over a short step. */
  rounding: number
  residual: number
  iterations: number
  mostIterations: number
  headError: number
  cancelled: boolean
  atRoundingFloor: boolean
  history: { iterations: number; residual: number }[]
}

function searchOf(
  balance: SectionBalance,
  flow: FlowModel,
  step: LinearStep,
  wet: Uint8Array,
  start: Outcome | null,
  storage: StorageTerm | null,
  tolerance: number,
  options: SolverOptions,
): Search {
  const { d, held, fall, sink, source, yields, terms } = balance
  const count = d.active.length
  const lets = new Float64Array(count)
  const gets = source.slice()
  let stored = 0
  for (let c = 0; c < count; c++) {
    lets[c] = (fall[c] as number) + (sink[c] as number)
    if (!storage) continue
    gets[c] = (gets[c] as number) + (storage.before[c] as number) / storage.interval
    stored += ((yields[c] as number) / storage.interval) ** 2
  }
  for (const { cell, gravity } of terms) lets[cell] = (lets[cell] as number) + gravity
  const state = start
    ? stateOf(balance, start)
    : { p: new Float64Array(count), theta: new Float64Array(count) }
  for (let c = 0; c < count; c++) {
    if (d.active[c] !== 1) continue
    const free = Number.isNaN(held[c] as number)
    if (!free) {
      state.p[c] = held[c] as number
      state.theta[c] = 1
    } else if (!start) state.theta[c] = 1
    wet[c] = free && (state.theta[c] as number) >= 1 ? 1 : 0
  }
  return {
    balance,
    step,
    matrix: emptyMatrix(flow),
    stale: true,
    storage,
    tolerance,
    options,
    wet,
    state,
    given: new Float64Array(count),
    slope: new Float64Array(count),
    lets,
    gets,
    imbalance: new Float64Array(count),
    rightHandSide: drivingFlow(balance),
    rounding: 4 * Number.EPSILON * Math.sqrt(stored),
    residual: Number.POSITIVE_INFINITY,
    iterations: 0,
    mostIterations: mostIterations(step.method, count),
    headError: 0,
    cancelled: false,
    atRoundingFloor: false,
    history: [],
  }
}

/**
 * Changes the wet set until it is right and every cell balances. False when it did not get there. A residual that
 * rounding keeps above the tolerance counts as there if the estimated head error is below 1e-6 of the height.
 */
function findWetSet(run: Search): boolean {
  const { state, wet } = run
  const count = wet.length
  const r = new Float64Array(count)
  const change = new Float64Array(count)
  const theta = new Float64Array(count)
  const allowed = run.tolerance * run.rightHandSide + run.rounding
  let fewest = Number.POSITIVE_INFINITY
  let idle = 0
  let stuck = 0
  let settled = false
  for (let round = 0; round < mostChanges; round++) {
    settleTerms(run, round === 0)
    run.stale = true
    letFall(run, state, 1, r)
    const norm = norm2(r)
    flexibleMinimalResiduals(
      (v, out) => {
        letFall(run, { p: v, theta }, 0, out)
        for (let c = 0; c < count; c++) out[c] = -(out[c] as number)
      },
      (v, out) => nearly(run, v, out),
      r,
      change,
      Math.max(0.3 * allowed, settled ? 0 : 1e-3 * norm),
      stepsAtOnce(count),
    )
    let largest = 0
    for (let c = 0; c < count; c++) {
      if (wet[c] !== 1) continue
      state.p[c] = (state.p[c] as number) + (change[c] as number)
      largest = Math.max(largest, Math.abs(change[c] as number))
    }
    letFall(run, state, 1, r)
    // The last change is to what is left as the residual before it to the one after.
    run.headError = norm > 0 ? largest * Math.min(1, (2 * norm2(r)) / norm) : 0
    const before = run.residual
    const tired = idle >= patience
    const switched = switchCells(run, tired ? 1e-9 : Math.max(run.tolerance, 1e-13), !tired)
    measure(run)
    if (run.cancelled) return false
    settled = switched === 0
    if (settled) {
      if (run.residual * run.rightHandSide <= allowed) {
        run.atRoundingFloor = run.residual > run.tolerance
        return true
      }
      // Once or twice it may be that a drain or a seepage face came to act otherwise.
      stuck = run.residual > 0.5 * before ? stuck + 1 : 0
      if (stuck > 2 && run.residual < 1e-6) {
        run.atRoundingFloor = true
        return run.headError <= 1e-6 * heightOf(run)
      }
    }
    idle = switched < fewest ? 0 : idle + 1
    fewest = Math.min(fewest, switched)
    if (run.iterations >= run.mostIterations) return false
  }
  return false
}

/**
 * Norm of what drives the flow: all that would enter a full cell from outside at no pressure, and the weight of the
 * water in it, which is there even when water rests. Not what is stored: over a short step that is any amount.
 */
function drivingFlow({ d, held, terms, fall, source }: SectionBalance): number {
  const given = source.map((q, c) => q + (fall[c] as number))
  for (const { cell, conductance, level, cap, gravity } of terms) {
    given[cell] = (given[cell] as number) + conductance * Math.min(level, cap) + gravity
  }
  let sum = 0
  for (let c = 0; c < given.length; c++) {
    if (d.active[c] === 1 && Number.isNaN(held[c] as number)) sum += (given[c] as number) ** 2
  }
  return Math.sqrt(sum)
}

function measure(run: Search): void {
  const { balance, state, imbalance, storage } = run
  netInflow(balance, state, storage, imbalance)
  let sum = 0
  for (let c = 0; c < imbalance.length; c++) {
    if (balance.d.active[c] !== 1 || !Number.isNaN(balance.held[c] as number)) continue
    sum += (imbalance[c] as number) ** 2
  }
  run.residual = run.rightHandSide > 0 ? Math.sqrt(sum) / run.rightHandSide : 0
  run.history.push({ iterations: run.iterations, residual: run.residual })
  run.options.onProgress?.({
    iterations: run.iterations,
    residual: run.residual,
    percent: Math.round(Math.min(100, (100 * Math.log(Math.min(run.residual, 1))) / Math.log(run.tolerance))),
    phase: 'the wet set',
  })
}

/** How every term acts at the present pressure heads; at the very first look all that may let water out do. */
function settleTerms(run: Search, first: boolean): void {
  const { balance, given, slope, state } = run
  given.fill(0)
  slope.fill(0)
  for (const term of balance.terms) {
    const { cell, conductance, level, oneSided } = term
    const p = state.p[cell] as number
    const now = first && oneSided ? { q: conductance * (level - p), slope: conductance } : termFlow(term, p)
    // A vanishing slope keeps the equations regular where all that could hold a level rests.
    const own = now.slope === 0 ? 1e-9 * conductance : now.slope
    given[cell] = (given[cell] as number) + now.q + own * p
    slope[cell] = (slope[cell] as number) + own
  }
}

/**
 * Water falls: from the top row down, the saturation of every cell that drains from what reaches it, and in `out` the
 * net inflow of every wet cell. `share` 1: as it is; 0: only what depends on the pressure heads of wet cells.
 */
function letFall(run: Search, { p, theta }: SectionState, share: 0 | 1, out: Float64Array): void {
  const { balance, wet, given, slope, lets, gets, storage } = run
  const { d, columns, rows, east, north, held, yields, compressed } = balance
  for (let j = rows - 1; j >= 0; j--) {
    for (let i = 0; i < columns; i++) {
      const c = j * columns + i
      out[c] = 0
      if (d.active[c] !== 1) continue
      if (!Number.isNaN(held[c] as number)) {
        p[c] = share * (held[c] as number)
        theta[c] = share
        continue
      }
      if (wet[c] !== 1) p[c] = 0
      const own = p[c] as number
      let q = share * ((gets[c] as number) + (given[c] as number)) - (slope[c] as number) * own
      if (i > 0) q += (east[c - 1] as number) * (at(run, p, c - 1, share) - own)
      if (i < columns - 1) q += (east[c] as number) * (at(run, p, c + 1, share) - own)
      if (j > 0) q += (north[c - columns] as number) * (at(run, p, c - columns, share) - own)
      if (j < rows - 1) {
        const above = c + columns
        q += (north[c] as number) * (at(run, p, above, share) - own)
        q += (balance.fall[above] as number) * (theta[above] as number)
      }
      if (wet[c] === 1) {
        theta[c] = share
        if (storage) q -= ((compressed[c] as number) * own) / storage.interval
        out[c] = q - share * (lets[c] as number)
      } else {
        const kept = storage ? (yields[c] as number) / storage.interval : 0
        const full = (lets[c] as number) + kept
        const flow = q + share * kept
        theta[c] = full > 0 ? flow / full : flow > 0 && share === 1 ? Number.POSITIVE_INFINITY : 0
      }
    }
  }
}

/** Pressure head of a neighbour: cells that drain have none, whatever stands in the array. */
function at(run: Search, p: Float64Array, c: number, share: 0 | 1): number {
  if (run.wet[c] === 1) return p[c] as number
  const held = run.balance.held[c] as number
  return Number.isNaN(held) ? 0 : share * held
}

/**
 * Lets cells of negative pressure drain and fills those that get too much; how many were switched. `hair`: share of the
 * height and of a full cell that is taken for nothing. Not `together`: cells are filled only when none has to drain.
 */
function switchCells(run: Search, hair: number, together: boolean): number {
  const { wet, state } = run
  const { p, theta } = state
  const least = -hair * heightOf(run)
  let drained = 0
  for (let c = 0; c < wet.length; c++) {
    if (wet[c] !== 1 || (p[c] as number) >= least) continue
    wet[c] = 0
    p[c] = 0
    drained++
  }
  if (drained > 0 && !together) return drained
  let filled = 0
  for (let c = 0; c < wet.length; c++) {
    if (wet[c] === 1 || !((theta[c] as number) > 1 + hair)) continue
    // Cells just drained still have the saturation 1 of wet ones, held cells always.
    wet[c] = 1
    theta[c] = 1
    filled++
  }
  return drained + filled
}

function heightOf({ balance }: Search): number {
  const { yEdges, rows } = balance.d.grid
  return (yEdges[rows] as number) - (yEdges[0] as number)
}

/** About the solution of the wet cells' symmetric equations, water that leaves the wet set taken as lost. */
function nearly(run: Search, r: Float64Array, out: Float64Array): boolean {
  const { step } = run
  step.stale = run.stale
  // Relaxation scales the matrix in place.
  if (run.stale || step.method === 'sor') setMatrix(run)
  run.stale = false
  const start = run.iterations
  const outcome = step.solve(run.matrix, r, {
    target: 1e-2 * norm2(r),
    headTolerance: Number.POSITIVE_INFINITY,
    mostIterations: run.mostIterations - start,
    watch: (iterations) => {
      run.iterations = start + iterations
      run.cancelled = run.options.isCancelled?.() ?? false
      return run.cancelled
    },
  })
  run.iterations = start + outcome.iterations
  out.set(step.y)
  return !run.cancelled && run.iterations < run.mostIterations
}

function setMatrix(run: Search): void {
  const { balance, wet, matrix, slope, storage } = run
  const { columns, rows, east, north, compressed } = balance
  const { diag, west, south, own } = matrix
  diag.fill(1)
  own.fill(0)
  matrix.west.fill(0)
  matrix.east.fill(0)
  matrix.south.fill(0)
  matrix.north.fill(0)
  for (let c = 0; c < wet.length; c++) {
    if (wet[c] !== 1) continue
    own[c] = (slope[c] as number) + (storage ? (compressed[c] as number) / storage.interval : 0)
    diag[c] = own[c] as number
  }
  function link(a: number, b: number, conductance: number, towards: Float64Array): void {
    if (conductance === 0) return
    const [aWet, bWet] = [wet[a] === 1, wet[b] === 1]
    if (aWet) diag[a] = (diag[a] as number) + conductance
    if (bWet) diag[b] = (diag[b] as number) + conductance
    if (aWet && bWet) towards[b] = conductance
    else if (aWet) own[a] = (own[a] as number) + conductance
    else if (bWet) own[b] = (own[b] as number) + conductance
  }
  for (let j = 0; j < rows; j++) {
    for (let i = 0; i < columns; i++) {
      const c = j * columns + i
      if (i > 0) link(c - 1, c, east[c - 1] as number, west)
      if (j > 0) link(c - columns, c, north[c - columns] as number, south)
    }
  }
  for (let c = 0; c < wet.length; c++) if (!((diag[c] as number) > 0)) diag[c] = 1
}

function norm2(values: Float64Array): number {
  let sum = 0
  for (const value of values) sum += value * value
  return Math.sqrt(sum)
}

function outcomeOf(run: Search, flow: FlowModel, converged: boolean): Outcome {
  const { balance, state, step } = run
  const { d, columns, z } = balance
  const { byWell } = sectionField(balance, state, run.storage)
  return {
    flow,
    heads: state.p.map((p, c) => (d.active[c] === 1 ? p + (z[Math.floor(c / columns)] as number) : 0)),
    saturation: state.theta,
    rates: byWell,
    converged,
    cancelled: run.cancelled,
    atRoundingFloor: run.atRoundingFloor,
    method: step.method,
    kernels: step.kernels,
    iterations: run.iterations,
    residual: run.residual,
    headError: run.headError,
    unresolvedFlow: converged
      ? Math.sqrt(state.p.length) * Math.max(run.residual, 1e-15) * run.rightHandSide
      : 0,
    history: run.history,
  }
}

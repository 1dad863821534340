import { type Discretised, discretise } from './discretise'
import { evaluate, exchangeFlow, type FaceFlow, type FlowModel, type ProfileFlow } from './flow'
import type { Grid } from './grid'
import type { Model } from './model'
import { noFlowEdgesOf } from './no-flow-edges'
import { checkPoints, pointResults } from './points'
import type { Balance, KindFlow, NamedFlow, Result, Warning, WellResult } from './result'
import { type CellFlows, checkLinesAndRings, lineResults, ringResults } from './rings'
import {
  cellHeadOf,
  lowestLevelOf,
  type Progress,
  type SteadyOptions,
  type SteadyOutcome,
  solveSteady,
  wellHeadOf,
} from './steady'
import { engineVersion } from './version'

export type { Progress }

export interface SolveOptions extends SteadyOptions {
  /** "sha256:…" of the model file, passed on into the result. */
  input?: string
}

export interface Solution {
  result: Result
  /** One head a cell, row by row from the lowest y, in the model's length and datum; NaN where there is no ground. */
  heads: Float64Array
  grid: Grid
  /** Stopped because `isCancelled` said so; the result is then as far as it came, and not converged. */
  cancelled: boolean
}

/** The tolerance on the true relative residual where the model file gives none. */
export const defaultTolerance = 1e-10

/**
 * Computes a model: one record with heads, convergence, balance and results by name. Throws ModelError (`path`,
 * `message`) for a model that is wrong or asks for what this version does not compute; anything else is a result,
 * with `converged` false when it did not get there.
 */
export function solveModel(model: Model, options: SolveOptions = {}): Solution {
  const d = discretise(model)
  checkPoints(d)
  checkLinesAndRings(d)
  const outcome = solveSteady(d, model.solver?.tolerance ?? defaultTolerance, options)
  return {
    result: resultOf(model, d, outcome, options.input),
    heads: headsOut(d, outcome.heads),
    grid: d.grid,
    cancelled: outcome.cancelled,
  }
}

function headsOut(d: Discretised, heads: Float64Array): Float64Array {
  const out = new Float64Array(heads.length).fill(Number.NaN)
  for (let cell = 0; cell < heads.length; cell++) {
    if (d.active[cell] === 1) out[cell] = (heads[cell] as number) + d.reference
  }
  return out
}

interface Tally {
  inflow: number
  outflow: number
}

function addTo(tally: Tally, q: number): void {
  if (q > 0) tally.inflow += q
  else tally.outflow -= q
}

interface Flows extends CellFlows {
  byBoundary: Tally[]
  byLeakage: Tally[]
  /** Into the ground through outer faces. */
  atFaces: Map<number, number>
}

/** Every flow between the ground and its outside, from the heads; cells held at a head take what their neighbours ask. */
function outsideFlows(flow: FlowModel, outcome: SteadyOutcome): Flows {
  const { d } = flow
  const { heads, rates, state } = outcome
  const count = d.active.length
  const flows: Flows = {
    wells: new Float64Array(count),
    leakage: new Float64Array(count),
    boundaries: new Float64Array(count),
    byBoundary: (d.model.boundaries ?? []).map(() => ({ inflow: 0, outflow: 0 })),
    byLeakage: (d.model.leakage ?? []).map(() => ({ inflow: 0, outflow: 0 })),
    atFaces: new Map(),
  }
  evaluate(flow, heads, rates, state, null)
  function into(list: Float64Array, cell: number, q: number): void {
    list[cell] = (list[cell] as number) + q
  }
  function through(face: number, q: number): void {
    if (face >= 0) flows.atFaces.set(face, (flows.atFaces.get(face) ?? 0) + q)
  }
  const out: FaceFlow = { q: 0, byLow: 0, byHigh: 0 }
  for (const exchange of d.exchanges) {
    exchangeFlow(flow, exchange, heads[exchange.cell] as number, out)
    const tallies = exchange.owner === 'boundaries' ? flows.byBoundary : flows.byLeakage
    addTo(tallies[exchange.index] as Tally, out.q)
    into(flows[exchange.owner], exchange.cell, out.q)
    through(exchange.face, out.q)
  }
  for (const { index, cell, face, rate } of d.specifiedFlows) {
    addTo(flows.byBoundary[index] as Tally, rate)
    into(flows.boundaries, cell, rate)
    through(face, rate)
  }
  for (let cell = 0; cell < count; cell++) {
    const by = d.fixedBy[cell] as number
    if (by < 0 || d.active[cell] !== 1) continue
    const q = -(state.imbalance[cell] as number)
    addTo(flows.byBoundary[by] as Tally, q)
    into(flows.boundaries, cell, q)
  }
  d.wells.forEach((well, index) => {
    for (const { cell, weight } of well.shares) into(flows.wells, cell, weight * (rates[index] as number))
  })
  return flows
}

function resultOf(model: Model, d: Discretised, outcome: SteadyOutcome, input: string | undefined): Result {
  const { flow, heads, rates } = outcome
  const flows = outsideFlows(flow, outcome)
  const wells: WellResult[] = d.wells.map((well, index) => {
    const rate = rates[index] as number
    const wellHead = wellHeadOf(flow, well, rate, heads)
    return {
      name: well.name,
      requested: [Math.abs(well.requested)],
      achieved: [Math.abs(rate)],
      cellHead: [cellHeadOf(well, heads) + d.reference],
      wellHead: [wellHead === null ? null : wellHead + d.reference],
    }
  })
  const recharge = d.rechargeByEntry.map((total, index) => {
    const tally = { inflow: 0, outflow: 0 }
    addTo(tally, total)
    return named((model.recharge ?? [])[index]?.name ?? '', tally)
  })
  const boundaries = flows.byBoundary.map((tally, index) =>
    named((model.boundaries ?? [])[index]?.name ?? '', tally),
  )
  const leakage = flows.byLeakage.map((tally, index) =>
    named((model.leakage ?? [])[index]?.name ?? '', tally),
  )
  const balance = balanceOf(model, d, outcome, flows)
  return {
    format: 'lavant-result',
    version: 1,
    engine: engineVersion,
    ...(input === undefined ? {} : { input }),
    converged: outcome.converged,
    method: 'sor',
    iterations: outcome.sweeps,
    residual: outcome.residual,
    grid: {
      columns: d.grid.columns,
      rows: d.grid.rows,
      cells: d.active.length,
      active: d.active.reduce((sum, entry) => sum + entry, 0),
    },
    times: [],
    points: pointResults(flow, heads, flows.atFaces, d.reference),
    wells,
    lines: lineResults(flow, heads, flows.atFaces),
    rings: ringResults(flow, heads, flows),
    boundaries,
    recharge,
    leakage,
    balance,
    noFlowEdges: noFlowEdgesOf(d),
    warnings: [
      ...d.warnings,
      ...warningsOf(flow, outcome, Math.max(balance.inflow[0] as number, balance.outflow[0] as number)),
    ],
    history: outcome.history,
    headError: outcome.headError,
  }
}

function named(name: string, { inflow, outflow }: Tally): NamedFlow {
  return { name, inflow: [inflow], outflow: [outflow] }
}

function balanceOf(model: Model, d: Discretised, outcome: SteadyOutcome, flows: Flows): Balance {
  const tallies = new Map<KindFlow['kind'], Tally>()
  function tallyOf(kind: KindFlow['kind']): Tally {
    const tally = tallies.get(kind) ?? { inflow: 0, outflow: 0 }
    tallies.set(kind, tally)
    return tally
  }
  function add(kind: KindFlow['kind'], { inflow, outflow }: Tally): void {
    const tally = tallyOf(kind)
    tally.inflow += inflow
    tally.outflow += outflow
  }
  model.boundaries?.forEach((boundary, index) => {
    if (boundary.kind !== 'seepage face') add(boundary.kind, flows.byBoundary[index] as Tally)
  })
  for (const total of d.rechargeByEntry) addTo(tallyOf('recharge'), total)
  for (const rate of outcome.rates) addTo(tallyOf('wells'), rate)
  for (const tally of flows.byLeakage) add('leakage', tally)
  let inflow = 0
  let outflow = 0
  const kinds: KindFlow[] = []
  for (const [kind, tally] of tallies) {
    inflow += tally.inflow
    outflow += tally.outflow
    kinds.push({ kind, inflow: [tally.inflow], outflow: [tally.outflow] })
  }
  const through = Math.max(inflow, outflow)
  // Where next to nothing flows, what the tolerance lets pass is no share of it that means anything.
  const measurable = through > outcome.unresolvedFlow
  return {
    inflow: [inflow],
    outflow: [outflow],
    storage: [0],
    errorPercent: [measurable ? (100 * (inflow - outflow)) / through : 0],
    kinds,
  }
}

function warningsOf(flow: FlowModel, outcome: SteadyOutcome, throughflow: number): Warning[] {
  const { d } = flow
  const { heads, rates } = outcome
  const warnings: Warning[] = []
  if (outcome.cancelled) {
    warnings.push({
      code: 'cancelled',
      severity: 'serious',
      text: 'The calculation was stopped before it had converged.',
    })
  } else if (!outcome.converged) {
    warnings.push({
      code: 'not-converged',
      severity: 'serious',
      text: `Not converged after ${outcome.sweeps} sweeps: the relative residual is ${outcome.residual.toExponential(2)}. The heads are not a solution.`,
    })
  } else if (outcome.atRoundingFloor) {
    warnings.push({
      code: 'rounding-floor',
      severity: 'note',
      text: `Rounding stopped the relative residual at ${outcome.residual.toExponential(2)}; the estimated error of any head is ${outcome.headError.toExponential(2)}.`,
    })
  }
  if (outcome.converged && outcome.unresolvedFlow > 0 && throughflow <= outcome.unresolvedFlow) {
    warnings.push({
      code: 'nothing-flows',
      severity: 'note',
      text: 'Next to nothing flows: all flows lie within the tolerance, so the balance is not given in percent.',
    })
  }
  d.wells.forEach((well, index) => {
    const rate = rates[index] as number
    if (Math.abs(rate) < Math.abs(well.requested) * (1 - 1e-6)) {
      const own = lowestLevelOf(flow, well) <= well.lowestLevel
      warnings.push({
        code: 'well-reduced',
        severity: 'check',
        text: `The well "${well.name}" gives ${Math.abs(rate).toPrecision(6)} of the ${Math.abs(well.requested)} asked for: ${
          own ? 'its lowest level is reached' : 'the ground there cannot yield more'
        }${well.radius > 0 ? ' at the well face' : ''}.`,
      })
    }
    if (well.shares.some(({ cell }) => (d.fixedBy[cell] as number) >= 0)) {
      warnings.push({
        code: 'well-in-fixed-head',
        severity: 'check',
        text: `The well "${well.name}" draws on cells held at a fixed head: it takes its water from there and moves no other head.`,
      })
    } else if (nearFixedHead(d, well.shares)) {
      warnings.push({
        code: 'well-near-fixed-head',
        severity: 'check',
        text: `The well "${well.name}" stands within two cells of a fixed head: the drawdown beside it depends on the cell size.`,
      })
    }
  })
  warnings.push(...levelWarnings(flow, heads))
  return warnings
}

function nearFixedHead(d: Discretised, shares: { cell: number }[]): boolean {
  const { columns, rows } = d.grid
  const atFixedFace = new Set(
    d.exchanges.filter((exchange) => exchange.kind === 'fixed').map(({ cell }) => cell),
  )
  return shares.some(({ cell }) => {
    const row = Math.floor(cell / columns)
    const column = cell - row * columns
    for (let j = Math.max(0, row - 2); j <= Math.min(rows - 1, row + 2); j++) {
      for (let i = Math.max(0, column - 2); i <= Math.min(columns - 1, column + 2); i++) {
        const other = j * columns + i
        if ((d.fixedBy[other] as number) >= 0 || atFixedFace.has(other)) return true
      }
    }
    return false
  })
}

function isDry(flow: FlowModel, heads: Float64Array, cell: number): boolean {
  const { base } = flow.flows[flow.d.profileOf[cell] as number] as ProfileFlow
  return (heads[cell] as number) <= base + 2 * flow.film
}

function levelWarnings(flow: FlowModel, heads: Float64Array): Warning[] {
  const { d } = flow
  let dry = 0
  let belowTop = 0
  for (let cell = 0; cell < heads.length; cell++) {
    if (d.active[cell] !== 1) continue
    const h = heads[cell] as number
    const number = d.profileOf[cell] as number
    if (d.unconfined) {
      if (isDry(flow, heads, cell)) dry++
    } else {
      const { top } = d.profiles[number] as Discretised['profiles'][number]
      if (h < (top[top.length - 1] as number)) belowTop++
    }
  }
  const warnings: Warning[] = []
  if (dry > 0) {
    warnings.push({
      code: 'dry-cells',
      severity: 'check',
      text: `${dry} ${dry === 1 ? 'cell is' : 'cells are'} dry: the head there is only formal. None is left out of the balance.`,
    })
  }
  const drawn = new Set<string>()
  for (const { index, cell, rate } of d.specifiedFlows) {
    if (d.unconfined && rate < 0 && isDry(flow, heads, cell))
      drawn.add(`"${d.model.boundaries?.[index]?.name}"`)
  }
  if (drawn.size > 0) {
    warnings.push({
      code: 'outflow-from-dry-cells',
      severity: 'serious',
      text: `The specified outflow of ${[...drawn].join(', ')} is more than the ground can yield: it is drawn from dry cells.`,
    })
  }
  if (belowTop > 0) {
    warnings.push({
      code: 'confined-below-top',
      severity: 'note',
      text: `The head lies below the top of the ground in ${belowTop} ${belowTop === 1 ? 'cell' : 'cells'}: confined flow counts the full thickness there.`,
    })
  }
  return warnings
}

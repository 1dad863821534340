import type { Outcome } from './balancer'
import { type Discretised, discretise } from './discretise'
import { faceOf } from './faces'
import {
  evaluate,
  exchangeFlow,
  type FaceFlow,
  type FlowModel,
  type FlowState,
  flowAtFace,
  flowModelOf,
} from './flow'
import { cellAt } from './grid'
import { transmissivityAt } from './ground'
import { type LinearisedOptions, linearisedAt } from './linearised'
import type { Boundary, Model, StageValue, Value } from './model'
import { countedFaces, namedAt, namesOf, slopesOf } from './named-functions'
import type { SensitivityResult } from './result'
import { knownLevels, modelOfStage } from './stages'
import type { PlacedWell } from './wells'

/** The sensitivities of named results, and of each the field d(result) / d(ln K of the cell). */
export interface Sensitivities {
  results: SensitivityResult[]
  /** By result, one value a cell; none where directions of conductivity are oblique. */
  perLnK: Map<string, Float64Array>
}

/**
 * Derivatives of named results of a steady run by everything the model assumes, by the adjoint: with F(h, p) = 0 the
 * net inflow of the cells and J(h, p) a result, dJ/dp = J_p + lambda F_p where A' lambda = J_h and A = -F_h (Cacuci
 * 1981, J. Math. Phys. 22, 2794; Sykes et al. 1985, Water Resour. Res. 21, 359). One linear solve a result, however
 * many parameters. J_p and F_p come from laying the model out with the parameter changed a little both ways, at the
 * same heads. Null when cancelled.
 */
export function sensitivitiesOf(
  file: Model,
  outcome: Outcome,
  names: string[],
  options: LinearisedOptions,
): Sensitivities | null {
  const model = modelOfStage(file, 0)
  const linearised = linearisedAt(outcome, options)
  const adjoints: { name: string; lambda: Float64Array; slopes: Float64Array }[] = []
  const state = { flow: outcome.flow, heads: outcome.heads.slice(), rates: outcome.rates }
  const values = namedAt(state)
  const results: SensitivityResult[] = []
  for (const name of names) {
    const value = values.get(name) ?? null
    const slopes = value === null ? null : slopesOf(state, name)
    const lambda = slopes && linearised.solveTransposed(slopes)
    if (slopes && !lambda) return null
    if (slopes && lambda) adjoints.push({ name, lambda, slopes })
    results.push({ name, value, ...emptyRows(model) })
  }
  const byName = new Map(results.map((result) => [result.name, result]))
  const direct = new Map<string, number>()
  for (const parameter of parametersOf(model, outcome.flow.d)) {
    if (options.isCancelled?.()) return null
    const change = changeBy(model, outcome, parameter)
    for (const { name, lambda } of adjoints) {
      const own = change.named.get(name) ?? 0
      let sum = own
      for (let cell = 0; cell < lambda.length; cell++) {
        sum += (lambda[cell] as number) * (change.inflow[cell] as number)
      }
      parameter.put(byName.get(name) as SensitivityResult, sum)
      if (parameter.isMaterial) direct.set(name, (direct.get(name) ?? 0) + own)
    }
  }
  for (const { name, lambda } of adjoints) {
    const result = byName.get(name) as SensitivityResult
    result.wells.forEach((row, index) => {
      row.perRate = perRateOf(outcome, model, lambda, name, index)
    })
  }
  const perLnK = new Map<string, Float64Array>()
  if (!outcome.flow.d.corners) {
    for (const { name, lambda } of adjoints)
      perLnK.set(name, fieldOf(outcome, lambda, name, direct.get(name) ?? 0))
  }
  return { results, perLnK }
}

/** A row for every material, recharge, boundary, wall, leakage and well, nothing known yet. */
function emptyRows(model: Model): Omit<SensitivityResult, 'name' | 'value'> {
  return {
    materials: model.materials.map(({ name }) => ({ name, perLnK: 0, perK: 0 })),
    recharge: (model.recharge ?? []).map(({ name }) => ({ name, perRate: 0 })),
    boundaries: (model.boundaries ?? []).map(({ name }) => ({ name })),
    walls: (model.walls ?? []).map(({ name }) => ({ name, perLnK: 0 })),
    leakage: (model.leakage ?? []).map(({ name }) => ({ name, perHead: 0, perLnLeakance: 0 })),
    wells: (model.wells ?? []).map(({ name }) => ({ name, perRate: 0 })),
  }
}

/** d(result) / d(rate of a well), the rate positive as the model gives it. */
function perRateOf(
  outcome: Outcome,
  model: Model,
  lambda: Float64Array,
  name: string,
  index: number,
): number {
  const { flow, rates } = outcome
  const well = flow.d.wells[index] as PlacedWell
  const sign = model.wells?.[index]?.kind === 'abstraction' ? -1 : 1
  let sum = 0
  for (const { cell, weight } of well.shares) {
    if ((flow.d.fixedBy[cell] as number) < 0) sum += sign * weight * (lambda[cell] as number)
  }
  if (name !== `wells/${well.name}`) return sum
  const step = 0.01 * Math.abs(rates[index] as number) || 1e-6
  const [above, below] = [step, -step].map((by) => {
    const changed = rates.map((rate, other) => (other === index ? rate + sign * by : rate))
    return namedAt({ ...outcome, rates: changed }).get(name) ?? null
  })
  return typeof above === 'number' && typeof below === 'number' ? sum + (above - below) / (2 * step) : sum
}

interface Parameter {
  isMaterial?: true
  /** The model with the parameter changed by `by`. */
  change: (by: number) => Model
  /** How far to change it. */
  step: number
  put: (result: SensitivityResult, derivative: number) => unknown
}

/** Everything a model assumes, wells' rates apart, that results can be told the sensitivity to. */
function parametersOf(model: Model, d: Discretised): Parameter[] {
  const small = 1e-4
  const level = small * Math.max(d.headRange, 1e-2)
  const parameters: Parameter[] = []
  for (const [index, { kx }] of model.materials.entries()) {
    parameters.push({
      isMaterial: true,
      step: small,
      change: (by) => {
        const factor = Math.exp(by)
        const materials = replaced(model.materials, index, (own) => ({
          ...own,
          kx: own.kx * factor,
          ky: own.ky * factor,
        }))
        return { ...model, materials }
      },
      put: ({ materials }, perLnK) => Object.assign(materials[index] ?? {}, { perLnK, perK: perLnK / kx }),
    })
  }
  for (const [index, { rate }] of (model.recharge ?? []).entries()) {
    parameters.push({
      step: 0.1 * Math.abs(rate as number) || 1e-6,
      change: (by) => {
        const recharge = replaced(model.recharge, index, (own) => ({ ...own, rate: shifted(own.rate, by) }))
        return { ...model, recharge }
      },
      put: ({ recharge }, perRate) => Object.assign(recharge[index] ?? {}, { perRate }),
    })
  }
  for (const [index, boundary] of (model.boundaries ?? []).entries()) {
    for (const { step, change, as } of boundaryChanges(boundary, level)) {
      parameters.push({
        step,
        change: (by) => ({ ...model, boundaries: replaced(model.boundaries, index, () => change(by)) }),
        put: ({ boundaries }, value) => Object.assign(boundaries[index] ?? {}, { [as]: value }),
      })
    }
  }
  for (const [index, { k }] of (model.walls ?? []).entries()) {
    if (k === 0) continue
    parameters.push({
      step: small,
      change: (by) => {
        const walls = replaced(model.walls, index, (own) => ({ ...own, k: own.k * Math.exp(by) }))
        return { ...model, walls }
      },
      put: ({ walls }, perLnK) => Object.assign(walls[index] ?? {}, { perLnK }),
    })
  }
  for (const index of (model.leakage ?? []).keys()) {
    parameters.push({
      step: level,
      change: (by) => {
        const leakage = replaced(model.leakage, index, (own) => ({ ...own, head: shifted(own.head, by) }))
        return { ...model, leakage }
      },
      put: ({ leakage }, perHead) => Object.assign(leakage[index] ?? {}, { perHead }),
    })
    parameters.push({
      step: small,
      change: (by) => {
        const factor = Math.exp(by)
        const leakage = replaced(model.leakage, index, (own) => ({ ...own, leakance: own.leakance * factor }))
        return { ...model, leakage }
      },
      put: ({ leakage }, perLnLeakance) => Object.assign(leakage[index] ?? {}, { perLnLeakance }),
    })
  }
  return parameters
}

interface BoundaryChange {
  as: 'perHead' | 'perLnConductance' | 'perFlux'
  step: number
  change: (by: number) => Boundary
}

function boundaryChanges(own: Boundary, level: number): BoundaryChange[] {
  switch (own.kind) {
    case 'fixed head':
      return [{ as: 'perHead', step: level, change: (by) => ({ ...own, head: shifted(own.head, by) }) }]
    case 'head-dependent flux':
      return [
        { as: 'perHead', step: level, change: (by) => ({ ...own, head: shifted(own.head, by) }) },
        {
          as: 'perLnConductance',
          step: 1e-4,
          change: (by) => ({ ...own, conductance: scaled(own.conductance, Math.exp(by)) }),
        },
      ]
    case 'drain':
      return [
        { as: 'perHead', step: level, change: (by) => ({ ...own, level: shifted(own.level, by) }) },
        {
          as: 'perLnConductance',
          step: 1e-4,
          change: (by) => ({ ...own, conductance: scaled(own.conductance, Math.exp(by)) }),
        },
      ]
    case 'specified flux': {
      const largest = Math.max(...[own.flux as StageValue].flat().map(Math.abs))
      return [
        {
          as: 'perFlux',
          step: 0.1 * largest || 1e-6,
          change: (by) => ({ ...own, flux: shifted(own.flux, by) }),
        },
      ]
    }
    case 'seepage face':
      return []
  }
}

function replaced<Row>(rows: Row[] | undefined, index: number, change: (row: Row) => Row): Row[] {
  return (rows ?? []).map((row, other) => (other === index ? change(row) : row))
}

/** A value of one stage, all of it higher by `by`. */
function shifted(value: Value, by: number): StageValue {
  return eachOf(value, (one) => one + by)
}

function scaled(value: Value, factor: number): StageValue {
  return eachOf(value, (one) => one * factor)
}

function eachOf(value: Value, change: (one: number) => number): StageValue {
  if (typeof value === 'number') return change(value)
  return Array.isArray(value) ? value.map(change) : eachOf(value.stages[0] as StageValue, change)
}

/** Derivatives, by a parameter, of every cell's net inflow and of every named result, at the heads of the outcome. */
function changeBy(
  model: Model,
  outcome: Outcome,
  parameter: Parameter,
): { inflow: Float64Array; named: Map<string, number> } {
  const { flow } = outcome
  const count = outcome.heads.length
  const inflow = new Float64Array(count)
  const named = new Map<string, number>()
  const [above, below] = [parameter.step, -parameter.step].map((by) => {
    const d = discretise(parameter.change(by), 0, knownLevels(model))
    const changed = { flow: flowModelOf(d), heads: heldHeads(d, outcome.heads), rates: outcome.rates }
    const state: FlowState = { imbalance: new Float64Array(count), forcing: new Float64Array(count) }
    evaluate(changed.flow, changed.heads, changed.rates, state, null)
    return { inflow: state.imbalance, named: namedAt(changed) }
  }) as [Changed, Changed]
  for (let cell = 0; cell < count; cell++) {
    if (flow.d.active[cell] !== 1 || (flow.d.fixedBy[cell] as number) >= 0) continue
    inflow[cell] = ((above.inflow[cell] as number) - (below.inflow[cell] as number)) / (2 * parameter.step)
  }
  for (const name of namesOf(flow.d)) {
    const high = above.named.get(name)
    const low = below.named.get(name)
    if (typeof high === 'number' && typeof low === 'number')
      named.set(name, (high - low) / (2 * parameter.step))
  }
  return { inflow, named }
}

interface Changed {
  inflow: Float64Array
  named: Map<string, number | null>
}

/** The heads with held cells at the heads that the changed model holds them at. */
function heldHeads(d: Discretised, heads: Float64Array): Float64Array {
  return heads.map((head, cell) => ((d.fixedBy[cell] as number) >= 0 ? (d.fixedHead[cell] as number) : head))
}

/**
 * d(result) / d(ln K) of every cell: of a face's flow q a cell's share of the resistance is what ln K of the cell
 * changes it by; a step in lambda across the face says what that is worth. `direct`: what all K together change the
 * result by at given heads; it belongs to the faces of a line or ring, and otherwise to the result's own cell.
 */
function fieldOf(outcome: Outcome, lambda: Float64Array, name: string, direct: number): Float64Array {
  const { flow, heads } = outcome
  const { d } = flow
  const field = new Float64Array(heads.length)
  const add = (cell: number, value: number) => {
    field[cell] = (field[cell] as number) + value
  }
  const counted = countedFaces(d, name)
  const faces = d.grid.rows * (d.grid.columns + 1) + d.grid.columns * (d.grid.rows + 1)
  for (let face = 0; face < faces; face++) {
    const { axis, low, high, lowHalf, highHalf } = faceOf(d.grid, face)
    if (low < 0 || high < 0 || d.active[low] !== 1 || d.active[high] !== 1) continue
    const q = flowAtFace(flow, heads, face)
    if (q === 0) continue
    const a = lowHalf / conductivity(flow, heads, low, axis)
    const b = highHalf / conductivity(flow, heads, high, axis)
    const worth = ((lambda[high] as number) - (lambda[low] as number) + (counted.get(face) ?? 0)) * q
    const part = perResistance(flow, heads, face, low, high, a + b)
    add(low, worth * a * part)
    add(high, worth * b * part)
  }
  const out: FaceFlow = { q: 0, byLow: 0, byHigh: 0 }
  for (const exchange of d.exchanges) {
    if (exchange.face < 0) continue
    exchangeFlow(flow, exchange, heads[exchange.cell] as number, out)
    const half = exchange.half / (exchange.width * conductivity(flow, heads, exchange.cell, exchange.axis))
    const outside = exchange.conductance > 0 ? 1 / exchange.conductance : Number.POSITIVE_INFINITY
    const share = Number.isFinite(outside) ? half / (half + outside) : 1
    add(exchange.cell, (lambda[exchange.cell] as number) * out.q * share)
  }
  if (counted.size === 0 && direct !== 0) {
    const well = d.wells.find((entry) => `wells/${entry.name}` === name)
    for (const { cell, weight } of well?.shares ?? []) add(cell, weight * direct)
    const point = (d.model.points ?? []).find((entry) => `points/${entry.name}` === name)
    if (point) add(cellAt(d.grid, point.x, point.y), direct)
  }
  return field
}

/** Transmissivity of a cell along an axis, as wet as it is. */
function conductivity(flow: FlowModel, heads: Float64Array, cell: number, axis: 'x' | 'y'): number {
  const { d } = flow
  const index = d.profileOf[cell] as number
  if (!d.unconfined) return (axis === 'x' ? flow.fullX : flow.fullY)[index] as number
  const profile = d.profiles[index] as Discretised['profiles'][number]
  return Math.max(
    transmissivityAt(profile, axis === 'x' ? profile.kx : profile.ky, heads[cell] as number),
    1e-300,
  )
}

/**
 * Of the conductance through a face, 1 / (open + wall) over its walled share and 1 / open over the rest: by how much
 * it falls, relative to itself, for one more unit of `open`.
 */
function perResistance(
  flow: FlowModel,
  heads: Float64Array,
  face: number,
  low: number,
  high: number,
  open: number,
): number {
  const { d } = flow
  const share = d.wallShare[face] as number
  if (share === 0) return 1 / open
  const thickness = [low, high].map((cell) => {
    const profile = d.profiles[d.profileOf[cell] as number] as Discretised['profiles'][number]
    const level = d.unconfined ? (heads[cell] as number) : Number.POSITIVE_INFINITY
    return Math.max(
      transmissivityAt(
        profile,
        profile.kx.map(() => 1),
        level,
      ),
      1e-300,
    )
  }) as [number, number]
  const wall = (d.wallResistance[face] as number) * 0.5 * (1 / thickness[0] + 1 / thickness[1])
  const walled = 1 / (open + wall)
  return (share * walled ** 2 + (1 - share) / open ** 2) / (share * walled + (1 - share) / open)
}

import type { Outcome } from './balancer'
import { type Linearised, type LinearisedOptions, linearisedAt } from './linearised'
import { namedAt, namesOf } from './named-functions'
import type { ResponseResult } from './result'
import type { PlacedWell } from './wells'

/**
 * What one more unit of each well's rate does to every named result: one linear solve a well, on the balance
 * linearised at the solution. Exact for confined flow; for small changes otherwise. Null when cancelled.
 */
export function responsesOf(outcome: Outcome, options: LinearisedOptions): ResponseResult[] | null {
  const { flow } = outcome
  const linearised = linearisedAt(outcome, options)
  const found: ResponseResult[] = []
  for (const index of flow.d.wells.keys()) {
    const response = responseOf(outcome, linearised, index)
    if (!response) return null
    found.push(response)
  }
  return found
}

function responseOf(outcome: Outcome, linearised: Linearised, index: number): ResponseResult | null {
  const { flow, heads, rates } = outcome
  const { d } = flow
  const well = d.wells[index] as PlacedWell
  const abstraction = d.model.wells?.[index]?.kind === 'abstraction'
  const sign = abstraction ? -1 : 1
  const inflow = new Float64Array(heads.length)
  for (const { cell, weight } of well.shares) inflow[cell] = sign * weight
  const change = linearised.solve(inflow)
  if (!change) return null
  const largest = change.reduce((most, value) => Math.max(most, Math.abs(value)), 0)
  const step = largest > 0 ? (1e-4 * Math.max(d.headRange, 1e-3)) / largest : 1
  const at = (factor: number) =>
    namedAt({
      flow,
      heads: heads.map((head, cell) => head + factor * (change[cell] as number)),
      rates: rates.map((rate, other) => (other === index ? rate + factor * sign : rate)),
    })
  const above = at(step)
  const below = at(-step)
  return {
    well: well.name,
    per: abstraction ? 'abstraction' : 'recharge',
    results: namesOf(d).map((name) => {
      const high = above.get(name) ?? null
      const low = below.get(name) ?? null
      return { name, change: high === null || low === null ? null : (high - low) / (2 * step) }
    }),
  }
}

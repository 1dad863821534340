import type { Discretised } from './discretise'
import type { FlowModel, ProfileFlow } from './flow'
import type { Report, RunRecord } from './record'
import type { Warning } from './result'
import { verticalFlowWarnings } from './vertical-flow'
import { freeSurfaceWarnings, suctionWarnings } from './water-table'
import { lowestLevelOf } from './well-heads'

/**
 * What whoever uses the result must know. `throughflow`: the greater of in- and outflow at the end, volume/time.
 */
export function warningsOf(run: RunRecord, throughflow: number): Warning[] {
  const warnings = convergenceWarnings(run, throughflow)
  const last = run.reports[run.reports.length - 1] as Report
  const { d, outcome } = last
  warnings.push(...reducedWells(run.reports))
  for (const well of d.wells) {
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
  }
  warnings.push(...levelWarnings(outcome.flow, outcome.heads))
  if (outcome.saturation) warnings.push(...freeSurfaceWarnings(d, outcome, outcome.saturation))
  else if (d.model.kind === 'section') warnings.push(...suctionWarnings(d, outcome))
  if (run.converged) warnings.push(...verticalFlowWarnings(run.reports))
  return warnings
}

function convergenceWarnings(run: RunRecord, throughflow: number): Warning[] {
  const warnings: Warning[] = []
  if (run.cancelled) {
    warnings.push({
      code: 'cancelled',
      severity: 'serious',
      text: 'The calculation was stopped before it had converged.',
    })
  } else if (!run.converged) {
    warnings.push({
      code: 'not-converged',
      severity: 'serious',
      text: `Not converged after ${run.iterations} ${run.method === 'sor' ? 'sweeps' : 'cycles'}: the relative residual is ${run.residual.toExponential(2)}. The heads are not a solution.`,
    })
  } else if (run.atRoundingFloor) {
    warnings.push({
      code: 'rounding-floor',
      severity: 'note',
      text: `Rounding stopped the relative residual at ${run.residual.toExponential(2)}; the estimated error of any head is ${run.headError.toExponential(2)}.`,
    })
  }
  if (run.converged && run.unresolvedFlow > 0 && throughflow <= run.unresolvedFlow) {
    warnings.push({
      code: 'nothing-flows',
      severity: 'note',
      text: 'Next to nothing flows: all flows lie within the tolerance, so the balance is not given in percent.',
    })
  }
  return warnings
}

/** Wells that gave less than was asked for, each at the time when it lacked most. */
function reducedWells(reports: Report[]): Warning[] {
  const most = new Map<string, { lack: number; text: string }>()
  for (const { time, d, outcome, moment } of reports) {
    d.wells.forEach((well, index) => {
      const rate = Math.abs(moment.wells[index] as number)
      const asked = Math.abs(well.requested)
      const lack = asked - rate
      if (lack <= 1e-6 * asked || lack <= (most.get(well.name)?.lack ?? 0)) return
      const own = Number.isFinite(well.lowestLevel) && lowestLevelOf(outcome.flow, well) <= well.lowestLevel
      const when = d.model.time.kind === 'transient' ? ` at time ${time}` : ''
      most.set(well.name, {
        lack,
        text: `The well "${well.name}" gives ${rate.toPrecision(6)} of the ${asked} asked for${when}: ${
          own ? 'its lowest level is reached' : 'the ground there cannot yield more'
        }${well.radius > 0 ? ' at the well face' : ''}.`,
      })
    })
  }
  return [...most.values()].map(({ text }) => ({ code: 'well-reduced', severity: 'check', text }))
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
    } else if (d.model.kind === 'plan') {
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

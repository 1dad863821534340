import type { Outcome } from './balancer'
import type { Discretised } from './discretise'
import type { Tally } from './flow-field'
import { gradientsOf } from './gradients'
import type { Model } from './model'
import { noFlowEdgesOf } from './no-flow-edges'
import { pointResults } from './points'
import type { Report, RunRecord } from './record'
import type { Balance, KindFlow, NamedFlow, PointResult, Result, RingResult, WellResult } from './result'
import { ringAreas } from './rings'
import { engineVersion } from './version'
import { warningsOf } from './warnings'
import { freeSurfaceOf, sectionPoints, seepageFacesOf } from './water-table'
import { cellHeadOf, wellHeadOf } from './well-heads'

/** The result of a run: heads, flows and balance by name at every reported time, and how the run went. */
export function resultOf(model: Model, run: RunRecord): Result {
  const { reports } = run
  const first = reports[0] as Report
  const balance = balanceOf(model, run)
  const end = reports.length - 1
  const throughflow = Math.max(balance.inflow[end] as number, balance.outflow[end] as number)
  const transient = model.time.kind === 'transient'
  return {
    format: 'lavant-result',
    version: 1,
    engine: engineVersion,
    converged: run.converged,
    method: run.method,
    kernels: run.kernels,
    iterations: run.iterations,
    residual: run.residual,
    ...(transient ? { steps: run.steps } : {}),
    grid: {
      columns: first.d.grid.columns,
      rows: first.d.grid.rows,
      cells: first.d.active.length,
      active: first.d.active.reduce((sum, entry) => sum + entry, 0),
    },
    times: transient ? reports.map(({ time }) => time) : [],
    points: pointsOf(reports),
    wells: wellsOf(reports),
    lines: (model.lines ?? []).map(({ name }, index) => ({
      name,
      discharge: reports.map(({ moment }) => moment.lines[index] as number),
    })),
    rings: ringsOf(model, reports),
    boundaries: namedFlows(model.boundaries, reports, (report) => report.moment.boundaries),
    recharge: namedFlows(model.recharge, reports, (report) => report.moment.recharge),
    leakage: namedFlows(model.leakage, reports, (report) => report.moment.leakage),
    balance,
    noFlowEdges: noFlowEdgesOf(first.d),
    ...sectionResults(reports[end] as Report),
    warnings: [...layoutWarnings(reports), ...warningsOf(run, throughflow)],
    history: run.history,
    headError: run.headError,
  }
}

/** Heads of an outcome in the model's datum, NaN where there is no ground and above a free surface. */
export function headsOut(d: Discretised, { heads, saturation }: Outcome): Float64Array {
  const out = new Float64Array(heads.length).fill(Number.NaN)
  for (let cell = 0; cell < heads.length; cell++) {
    if (d.active[cell] === 1 && (saturation?.[cell] ?? 1) >= 1)
      out[cell] = (heads[cell] as number) + d.reference
  }
  return out
}

/** What only vertical sections have, at the end. */
function sectionResults({ d, outcome, moment }: Report): Partial<Result> {
  if (d.model.kind !== 'section') return {}
  const { saturation } = outcome
  return {
    ...(saturation ? { freeSurface: freeSurfaceOf(d, outcome, saturation) } : {}),
    seepageFaces: seepageFacesOf(d, outcome, saturation, moment.atOuterFaces),
    gradients: gradientsOf(d, outcome, moment.atOuterFaces),
  }
}

/** What laying the stages out had to say, each thing once. */
function layoutWarnings(reports: Report[]): Result['warnings'] {
  const seen = new Map(reports.flatMap(({ d }) => d.warnings).map((warning) => [warning.text, warning]))
  return [...seen.values()]
}

function pointsOf(reports: Report[]): PointResult[] {
  const byReport = reports.map(({ d, outcome, moment }) =>
    outcome.saturation
      ? sectionPoints(d, outcome, outcome.saturation, moment.atOuterFaces)
      : pointResults(outcome.flow, outcome.heads, moment.atOuterFaces, d.reference),
  )
  return (byReport[0] as PointResult[]).map(({ name }, index) => {
    const all = byReport.map((points) => points[index] as PointResult)
    const why = all.find((point) => point.why !== undefined)?.why
    return { name, head: all.flatMap(({ head }) => head), ...(why === undefined ? {} : { why }) }
  })
}

function wellsOf(reports: Report[]): WellResult[] {
  return (reports[0] as Report).d.wells.map(({ name }, index) => {
    const result: WellResult = { name, requested: [], achieved: [], cellHead: [], wellHead: [] }
    for (const { d, outcome, moment } of reports) {
      const well = d.wells[index] as (typeof d.wells)[number]
      const level = wellHeadOf(outcome.flow, well, outcome.rates[index] as number, outcome.heads)
      result.requested.push(Math.abs(well.requested))
      result.achieved.push(Math.abs(moment.wells[index] as number))
      result.cellHead.push(cellHeadOf(well, outcome.heads) + d.reference)
      result.wellHead.push(level === null ? null : level + d.reference)
    }
    return result
  })
}

function ringsOf(model: Model, reports: Report[]): RingResult[] {
  const areas = ringAreas((reports[0] as Report).d)
  return (model.rings ?? []).map(({ name }, index) => {
    const flows = reports.map(({ moment }) => moment.rings[index] as (typeof moment.rings)[number])
    return {
      name,
      area: areas[index] as number,
      through: flows.map((ring) => ring.through),
      recharge: flows.map((ring) => ring.recharge),
      wells: flows.map((ring) => ring.wells),
      leakage: flows.map((ring) => ring.leakage),
      boundaries: flows.map((ring) => ring.boundaries),
      storage: flows.map((ring) => ring.storage),
      error: flows.map(
        (ring) => ring.through + ring.recharge + ring.wells + ring.leakage + ring.boundaries - ring.storage,
      ),
    }
  })
}

function namedFlows(
  rows: { name: string }[] | undefined,
  reports: Report[],
  talliesOf: (report: Report) => Tally[],
): NamedFlow[] {
  return (rows ?? []).map(({ name }, index) => {
    const tallies = reports.map((report) => talliesOf(report)[index] as Tally)
    return { name, inflow: tallies.map((one) => one.inflow), outflow: tallies.map((one) => one.outflow) }
  })
}

function balanceOf(model: Model, run: RunRecord): Balance {
  const { reports } = run
  const transient = model.time.kind === 'transient'
  return {
    inflow: reports.map(({ moment }) => moment.inflow),
    outflow: reports.map(({ moment }) => moment.outflow),
    storage: reports.map(({ moment }) => moment.storage),
    errorPercent: reports.map(({ moment }) => {
      const { inflow, outflow, storage } = moment
      const through = Math.max(inflow, outflow, Math.abs(storage))
      // Where next to nothing flows, what the tolerance lets pass is no share of it that means anything.
      return through > run.unresolvedFlow ? (100 * (inflow - outflow - storage)) / through : 0
    }),
    kinds: kindsOf(model, reports),
    ...(transient
      ? {
          volumes: {
            inflow: run.volumes.map(({ inflow }) => inflow),
            outflow: run.volumes.map(({ outflow }) => outflow),
            storage: run.volumes.map(({ storage }) => storage),
          },
        }
      : {}),
    worstCell: reports.map(({ moment }) => moment.worst),
  }
}

/** In- and outflow by kind of boundary, recharge, wells and leakage, those that the model has. */
function kindsOf(model: Model, reports: Report[]): KindFlow[] {
  const kinds = new Map<KindFlow['kind'], KindFlow>()
  function add(kind: KindFlow['kind'], at: number, { inflow, outflow }: Tally): void {
    const flow = kinds.get(kind) ?? {
      kind,
      inflow: reports.map(() => 0),
      outflow: reports.map(() => 0),
    }
    flow.inflow[at] = (flow.inflow[at] as number) + inflow
    flow.outflow[at] = (flow.outflow[at] as number) + outflow
    kinds.set(kind, flow)
  }
  for (const [at, { moment }] of reports.entries()) {
    model.boundaries?.forEach(({ kind }, index) => {
      add(kind, at, moment.boundaries[index] as Tally)
    })
    for (const tally of moment.recharge) add('recharge', at, tally)
    for (const q of moment.wells) add('wells', at, { inflow: Math.max(q, 0), outflow: Math.max(-q, 0) })
    for (const tally of moment.leakage) add('leakage', at, tally)
  }
  return [...kinds.values()]
}

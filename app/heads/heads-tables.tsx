import { type Column, DataTable } from '~/components/data-table'
import type { Band, NamedFlow, Result } from '~/solver/result'
import { formatNumber, formatSigned } from '~/units'
import { balanceState, errorInWords } from './account'
import { storageFlow, totalFlow } from './moment'
import { bandInWords } from './verification'

/** A named point of the run, with its head and what is known of the run compared with; in the run's unit. */
export interface PointLine {
  name: string
  x: number
  y: number
  head: number | null
  before: number | null
  drawdown: number | null
  why: string | null
  band?: Band
}

/** Heads at named points. Choosing a name rings the point on the plan. */
export function PointTable({
  lines,
  unit,
  compared,
  selected,
  near,
  onSelect,
}: {
  lines: PointLine[]
  unit: string
  /** The run compared with, in words; null when there is none. */
  compared: string | null
  selected: string | null
  near: string | null
  onSelect: (name: string | null) => void
}) {
  const columns: Column<PointLine>[] = [
    {
      head: 'Point',
      cell: (line) => <SelectName name={line.name} selected={selected === line.name} onSelect={onSelect} />,
    },
    { head: 'x', unit, cell: (line) => formatNumber(line.x, 1) },
    { head: 'y', unit, cell: (line) => formatNumber(line.y, 1) },
    { head: 'Head', unit, cell: (line) => <b className="font-semibold">{formatNumber(line.head, 3)}</b> },
  ]
  if (lines.some((line) => line.band)) {
    columns.push({ head: 'Error band', unit, cell: (line) => bandInWords(line.band) })
  }
  if (compared) {
    columns.push(
      { head: `Head, ${compared}`, unit, cell: (line) => formatNumber(line.before, 3) },
      { head: 'Drawdown', unit, cell: (line) => formatNumber(line.drawdown, 3) },
    )
  }
  if (lines.some((line) => line.why !== null)) {
    columns.push({ head: 'Why there is no head', words: true, cell: (line) => line.why ?? '' })
  }
  return (
    <DataTable
      caption="Heads at named points"
      columns={columns}
      rows={lines}
      rowKey={(line) => line.name}
      chosen={(line) => line.name === selected || line.name === near}
      empty="This case has no named points: add them in section 2, Ground, and compute again."
    />
  )
}

function SelectName({
  name,
  selected,
  onSelect,
}: {
  name: string
  selected: boolean
  onSelect: (name: string | null) => void
}) {
  return (
    <button
      type="button"
      aria-pressed={selected}
      title={selected ? 'Take the ring off the plan' : 'Ring it on the plan'}
      className="font-semibold text-flint underline decoration-rule underline-offset-4 hover:decoration-bourne aria-pressed:text-bourne aria-pressed:decoration-bourne"
      onClick={() => onSelect(selected ? null : name)}
    >
      {name}
    </button>
  )
}

interface WellLine {
  name: string
  kind: string
  requested: number
  achieved: number
  cellHead: number
  wellHead: number | null
  band: Band
}

/** Wells: the rate asked for and the rate that the ground can give, with the heads there. */
export function WellTable({
  result,
  kinds,
  units,
  selected,
  near,
  onSelect,
}: {
  result: Result
  /** Kind of each well by name. */
  kinds: ReadonlyMap<string, string>
  units: { length: string; rate: string }
  selected: string | null
  near: string | null
  onSelect: (name: string | null) => void
}) {
  const lines = result.wells.map(
    ({ name, requested, achieved, cellHead, wellHead, band }): WellLine => ({
      name,
      kind: kinds.get(name) ?? '',
      requested: requested[0] ?? Number.NaN,
      achieved: achieved[0] ?? Number.NaN,
      cellHead: cellHead[0] ?? Number.NaN,
      wellHead: wellHead[0] ?? null,
      band: band?.[0] ?? null,
    }),
  )
  const short = (line: WellLine) => line.achieved < line.requested * (1 - 1e-6)
  return (
    <DataTable
      caption="Wells"
      rows={lines}
      rowKey={(line) => line.name}
      chosen={(line) => line.name === selected || line.name === near}
      empty="This case has no wells."
      columns={[
        {
          head: 'Well',
          cell: (line) => (
            <SelectName name={line.name} selected={selected === line.name} onSelect={onSelect} />
          ),
        },
        { head: 'Kind', words: true, cell: (line) => line.kind },
        { head: 'Requested', unit: units.rate, cell: (line) => formatNumber(line.requested) },
        {
          head: 'Achieved',
          unit: units.rate,
          cell: (line) =>
            short(line) ? (
              <b className="font-semibold text-madder">{formatNumber(line.achieved)} (less)</b>
            ) : (
              formatNumber(line.achieved)
            ),
        },
        { head: 'Head in its cell', unit: units.length, cell: (line) => formatNumber(line.cellHead, 3) },
        {
          head: 'Head at the well face',
          unit: units.length,
          cell: (line) => formatNumber(line.wellHead, 3),
        },
        ...(lines.some((line) => line.band)
          ? [
              {
                head: 'Error band',
                unit: units.length,
                cell: (line: WellLine) => bandInWords(line.band),
              },
            ]
          : []),
      ]}
    />
  )
}

interface FlowLine {
  name: string
  inflow: number
  outflow: number
}

function flowColumns(first: string, rate: string): Column<FlowLine>[] {
  const zero = (value: number) => (value === 0 ? '0' : formatNumber(value))
  return [
    { head: first, cell: (line) => line.name },
    { head: 'Into the ground', unit: rate, cell: (line) => zero(line.inflow) },
    { head: 'Out of the ground', unit: rate, cell: (line) => zero(line.outflow) },
    { head: 'Net', unit: rate, cell: (line) => formatSigned(netOf(line)) },
  ]
}

/** What is left after in and out cancel to within rounding is nothing. */
function netOf({ inflow, outflow }: FlowLine): number {
  const net = inflow - outflow
  return Math.abs(net) < 1e-9 * Math.max(inflow, outflow) ? 0 : net
}

function steady({ name, inflow, outflow }: NamedFlow): FlowLine {
  return { name, inflow: inflow[0] ?? 0, outflow: outflow[0] ?? 0 }
}

/** The water balance by kind, then by named boundary, recharge zone and leaking layer. */
export function BalanceTables({ result, rate }: { result: Result; rate: string }) {
  const { balance } = result
  const error = balance.errorPercent[0] ?? Number.NaN
  const kinds = balance.kinds.map(({ kind, inflow, outflow }) => steady({ name: kind, inflow, outflow }))
  const total = steady(totalFlow(result))
  const named = [...result.boundaries, ...result.recharge, ...result.leakage].map(steady)
  const looks = { good: 'text-moss', warn: 'text-ochre', alarm: 'text-madder' }
  return (
    <>
      <DataTable
        caption="Water balance by kind"
        columns={flowColumns('Kind', rate)}
        rows={[...kinds, ...storageFlow(result).map(steady), total]}
        rowKey={(line) => line.name}
        chosen={(line) => line === total}
      />
      <p className="mt-2 mb-4 text-[0.93rem] text-flint-2">
        Error of the balance{' '}
        <b className={`font-semibold ${looks[balanceState(error)]}`}>{errorInWords(error)}</b> of the flow
        through the model{result.converged ? '' : ', of a run that did not converge'}.
      </p>
      {named.length > 0 && (
        <DataTable
          caption="Water balance by named boundary and recharge"
          columns={flowColumns('Boundary or recharge', rate)}
          rows={named}
          rowKey={(line) => line.name}
        />
      )}
    </>
  )
}

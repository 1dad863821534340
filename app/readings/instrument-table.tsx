import { href, Link } from 'react-router'
import { DataTable } from '~/components/data-table'
import { localTime } from '~/components/local-time'
import { convert, formatNumber, type ProjectUnits } from '~/units'
import { enteredText } from './reading'
import type { LastReading } from './readings.server'
import type { SeriesPoint } from './thin'

export interface InstrumentLine extends LastReading {
  /** Reference level in force now, in metres; null where none is. */
  referenceLevel: number | null
  /** A year's course in a few points, for the small picture. */
  course: SeriesPoint[]
}

/** Days from an instant to another in words that a glance takes in. */
export function ageText(at: string, now: string): string {
  const hours = (Date.parse(now) - Date.parse(at)) / 3_600_000
  if (hours < 48) return `${Math.max(0, Math.round(hours))} h`
  if (hours < 24 * 90) return `${Math.round(hours / 24)} d`
  return `${formatNumber(hours / 24 / 365.25, 1)} a`
}

/** Where every instrument stands: reference level, last reading and head, age, count. */
export function InstrumentTable({
  lines,
  projectId,
  timeZone,
  units,
  now,
  hoveredId,
}: {
  lines: readonly InstrumentLine[]
  projectId: number
  timeZone: string
  units: ProjectUnits
  now: string
  hoveredId?: string | null
}) {
  const clock = localTime(timeZone)
  const unit = units.length
  const metres = (value: number | null) =>
    value === null ? '–' : formatNumber(convert({ value, unit: 'm' }, unit), 2)
  const all = lines.flatMap((line) => line.course.map(([at]) => at))
  const span = { from: Math.min(...all), to: Math.max(...all) }
  return (
    <DataTable
      caption="Last readings"
      rows={[...lines]}
      rowKey={(line) => line.instrumentId}
      chosen={(line) => line.instrumentId === hoveredId}
      empty="There is no instrument yet."
      columns={[
        {
          head: 'Instrument',
          words: true,
          cell: (line) => (
            <Link
              to={href('/projects/:projectId/readings/instruments/:instrumentId', {
                projectId: String(projectId),
                instrumentId: line.instrumentId,
              })}
            >
              {line.name}
            </Link>
          ),
        },
        { head: 'Reference level', unit, cell: (line) => metres(line.referenceLevel) },
        { head: 'Course', words: true, cell: (line) => <Sparkline points={line.course} span={span} /> },
        {
          head: 'Head',
          unit,
          cell: (line) => <b className="font-semibold">{metres(line.lastHead?.head ?? null)}</b>,
        },
        { head: 'Last reading', words: true, cell: (line) => <Last line={line} /> },
        {
          head: 'Taken at',
          cell: (line) => (line.last ? clock.minute(line.last.at) : '–'),
        },
        { head: 'Age', cell: (line) => (line.last ? ageText(line.last.at, now) : '–') },
        { head: 'Readings', cell: (line) => formatNumber(line.count, 0) },
      ]}
    />
  )
}

function Last({ line }: { line: InstrumentLine }) {
  const { last } = line
  if (line.outOfService && !last) return <span className="text-flint-2">out of service</span>
  if (!last) return <span className="text-flint-2">none yet</span>
  return (
    <span className="whitespace-nowrap">
      {last.status ? (
        <b className="font-semibold text-ochre">{last.status}</b>
      ) : (
        `${last.quantity} ${enteredText(last)}`
      )}
      {last.why && !last.status && <small className="ml-1.5 text-ochre">{last.why}</small>}
      {line.outOfService && <small className="ml-1.5 text-flint-2">out of service</small>}
    </span>
  )
}

const width = 120
const height = 26

/** The course of heads without axes: its form only; all instruments share the span of time. */
export function Sparkline({
  points,
  span,
}: {
  points: readonly SeriesPoint[]
  span: { from: number; to: number }
}) {
  if (points.length < 2 || span.to <= span.from) return null
  const heads = points.map(([, head]) => head)
  const low = Math.min(...heads)
  const range = Math.max(...heads) - low || 1
  const path = points
    .map(([at, head], index) => {
      const x = ((at - span.from) / (span.to - span.from)) * (width - 4) + 2
      const y = height - 3 - ((head - low) / range) * (height - 6)
      return `${index === 0 ? 'M' : 'L'}${x.toFixed(1)} ${y.toFixed(1)}`
    })
    .join('')
  return (
    <svg
      width={width}
      height={height}
      viewBox={`0 0 ${width} ${height}`}
      aria-hidden="true"
      className="block text-bourne"
    >
      <path d={path} fill="none" stroke="currentColor" strokeWidth="1.2" />
    </svg>
  )
}

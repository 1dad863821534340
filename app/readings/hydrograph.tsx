import { useEffect, useRef, useState } from 'react'
import { href } from 'react-router'
import { type ChartLine, LineChart } from '~/components/line-chart'
import { localTime } from '~/components/local-time'
import { Notice } from '~/components/notice'
import { convert, formatNumber, type ProjectUnits } from '~/units'
import type { ReadingQuantity } from './reading'
import type { Series, SeriesLine } from './readings.server'

interface HydrographProps {
  projectId: number
  instrument: { id: string; name: string }
  /** The whole record, thinned. */
  series: Series
  units: ProjectUnits
  /** "m above site datum" */
  levels: string
  timeZone: string
  /** Minutes east of UTC of the site's clock in winter. */
  winterOffset: number
}

/** The name of a fixed offset: UTC+01:00. */
export function offsetName(minutes: number): string {
  if (minutes === 0) return 'UTC'
  const two = (n: number) => String(n).padStart(2, '0')
  const size = Math.abs(minutes)
  return `UTC${minutes < 0 ? '−' : '+'}${two(Math.floor(size / 60))}:${two(size % 60)}`
}

/** Points with a break after each gap, so that no line is drawn where nothing was read. */
export function withBreaks(series: Pick<SeriesLine, 'points' | 'gaps'>): [number, number | null][] {
  const gapsAfter = [...series.gaps].sort((a, b) => a - b)
  const broken: [number, number | null][] = []
  let next = 0
  for (const point of series.points) {
    let passed = false
    while (next < gapsAfter.length && (gapsAfter[next] as number) < point[0]) {
      passed = true
      next++
    }
    if (passed) broken.push([(gapsAfter[next - 1] as number) + 1, null])
    broken.push(point)
  }
  return broken
}

const lineNames: Record<ReadingQuantity, string> = {
  level: 'Levels',
  dip: 'Dips',
  'pressure head': 'Pressure heads',
}
const lineColours = ['mark', 'alarm', 'text'] as const

/** Readings are there, and none gives a head: says why, instead of an empty drawing. */
function NoHead({ series }: { series: Series }) {
  const reasons = [...new Set(series.marks.map((mark) => mark.word))]
  return (
    <Notice tone="warn" title="No reading of this instrument gives a head yet">
      {reasons.slice(0, 4).join(', ')}.
    </Notice>
  )
}

/** Heads of one instrument against time. Zooming in fetches what thinning left out. */
export function Hydrograph(props: HydrographProps) {
  const { projectId, instrument, units, levels, timeZone, winterOffset } = props
  const [finer, setFiner] = useState<{ of: Series; from: number; to: number; series: Series } | null>(null)
  const timer = useRef<ReturnType<typeof setTimeout>>(undefined)
  const asking = useRef<AbortController>(null)
  useEffect(
    () => () => {
      clearTimeout(timer.current)
      asking.current?.abort()
    },
    [],
  )
  const whole = props.series
  const read = [
    ...whole.lines.flatMap((line) => line.points.map(([at]) => at)),
    ...whole.marks.map((mark) => mark.at),
  ]
  if (read.length === 0) {
    return (
      <p className="border border-rule bg-chalk-2 px-3 py-2.5 text-flint-2">
        There is no reading to draw yet.
      </p>
    )
  }
  if (whole.lines.length === 0) return <NoHead series={whole} />
  const span = { from: Math.min(...read), to: Math.max(Math.max(...read), Math.min(...read) + 3_600_000) }
  const loaded = finer && finer.of === whole ? finer : null
  const clock = localTime(timeZone)
  const inUnit = (metres: number) => convert({ value: metres, unit: 'm' }, units.length)

  async function fetchFiner(from: number, to: number) {
    asking.current?.abort()
    asking.current = new AbortController()
    const path = href('/projects/:projectId/readings/instruments/:instrumentId/series', {
      projectId: String(projectId),
      instrumentId: instrument.id,
    })
    const query = new URLSearchParams({
      from: String(Math.floor(from)),
      to: String(Math.ceil(to)),
      points: '2000',
    })
    try {
      const response = await fetch(`${path}?${query}`, { signal: asking.current.signal })
      if (response.ok) setFiner({ of: whole, from, to, series: (await response.json()) as Series })
    } catch (error) {
      // Zoomed on meanwhile, or the server is away: the thinned record stays on the page.
      const left = error instanceof DOMException && error.name === 'AbortError'
      if (!left && !(error instanceof TypeError)) throw error
    }
  }

  function zoom(from: number, to: number) {
    clearTimeout(timer.current)
    if (whole.lines.every((line) => line.points.length >= line.total)) return
    timer.current = setTimeout(() => void fetchFiner(from, to), 350)
  }

  const lines = whole.lines.map((line, index): ChartLine => {
    const piece = loaded?.series.lines.find((one) => one.quantity === line.quantity)
    const points = loaded && piece ? spliced(withBreaks(line), withBreaks(piece), loaded) : withBreaks(line)
    return {
      name: lineNames[line.quantity],
      colour: lineColours[index] ?? 'quiet',
      // Hand dips beside a logger check it: points, not a second line.
      pointsOnly: line.quantity === 'dip' && whole.lines.length > 1,
      dots: line.total <= 120,
      points: points.map(([at, head]) => [at, head === null ? null : inUnit(head)] as const),
    }
  })
  const dividers = whole.levels.filter((level) => level.at >= span.from && level.at <= span.to)
  return (
    <LineChart
      label={describe(instrument.name, whole, units, clock.day)}
      height={380}
      lines={lines}
      marks={whole.marks.map((mark) => ({
        at: mark.at,
        value: mark.head === null ? null : inUnit(mark.head),
        word: mark.word,
      }))}
      marksName="status or no head"
      dividers={dividers.map((level) => ({
        at: level.at,
        word: `${level.levelled} ${formatNumber(inUnit(level.level), 2)}`,
      }))}
      valueName={`Head (${levels})`}
      decimals={2}
      span={span}
      clockOffset={winterOffset}
      clockName={`${offsetName(winterOffset)} all the year`}
      instant={(at) => `${clock.minute(new Date(at).toISOString())} site time`}
      onZoom={zoom}
    />
  )
}

/** The thinned record with a finer piece of it in its place. */
function spliced(
  whole: [number, number | null][],
  piece: [number, number | null][],
  span: { from: number; to: number },
): [number, number | null][] {
  return [...whole.filter(([at]) => at < span.from), ...piece, ...whole.filter(([at]) => at > span.to)]
}

function describe(name: string, series: Series, units: ProjectUnits, day: (iso: string) => string): string {
  const points = series.lines.flatMap((line) => line.points)
  const total = series.lines.reduce((sum, line) => sum + line.total, 0)
  const heads = points.map(([, head]) => convert({ value: head, unit: 'm' }, units.length))
  const instants = points.map(([at]) => at)
  const iso = (at: number) => day(new Date(at).toISOString())
  return `Hydrograph of ${name}: ${total} heads from ${iso(Math.min(...instants))} to ${iso(Math.max(...instants))}, between ${formatNumber(Math.min(...heads), 2)} and ${formatNumber(Math.max(...heads), 2)} ${units.length}.`
}

import { type FormEvent, useCallback, useId, useMemo, useRef, useState } from 'react'
import type { Vertex } from '~/book/field'
import { Button } from '~/components/button'
import { type ChartTheme, useChartTheme } from '~/components/chart-colours'
import { ContourChart, pngOf } from '~/components/contour-chart'
import { saveBlob } from '~/components/save-blob'
import { formatNumber } from '~/units'
import { type CutLine, cutChart, cutThrough } from './cut'
import type { GroundLevels } from './features'
import { type HeadField, headAt } from './field'
import { contouringOf, headsPicture, type PictureFeatures, type PictureInput, pictureLayout } from './picture'

export interface FigureOfRun {
  /** Heads of the run, in its own unit of length. */
  heads: HeadField
  /** Heads of the run compared with, and the drawdown from it; null when none is. */
  before: HeadField | null
  drawdown: HeadField | null
  features: PictureFeatures
  unit: string
  datum: string
  converged: boolean
  /** "case Base, run 3". */
  of: string
  /** "run 1 (Before pumping)"; empty when nothing is compared. */
  against: string
  groundAt: (x: number, y: number) => GroundLevels
  fileName: string
}

interface FigureProps {
  figure: FigureOfRun
  shows: 'head' | 'drawdown'
  /** Contour interval asked for; undefined is automatic. */
  interval: number | undefined
  selected: string | null
  /** Name of the point or well under the pointer. */
  onNear: (name: string | null) => void
}

const pointerReach = 14

/** The plan with its caption, what the pointer reads, and the cut. */
export function HeadsFigure({ figure, shows, interval, selected, onNear }: FigureProps) {
  const theme = useChartTheme()
  const [cut, setCut] = useState<Vertex[]>([])
  const [cutting, setCutting] = useState(false)
  const [reading, setReading] = useState<Reading | null>(null)
  const field = shows === 'drawdown' && figure.drawdown ? figure.drawdown : figure.heads

  const input = useMemo(
    (): PictureInput => ({
      ...field,
      field: shows,
      features: figure.features,
      unit: figure.unit,
      datum: figure.datum,
      converged: figure.converged,
    }),
    [field, shows, figure],
  )
  const contouring = useMemo(() => contouringOf(input, interval), [input, interval])
  const caption = captionOf(figure, shows, contouring?.interval)
  const place = useMemo(() => {
    const found = [...figure.features.points, ...figure.features.wells].find(({ name }) => name === selected)
    return found ? ([found.x, found.y] as Vertex) : undefined
  }, [figure, selected])

  const optionsFor = useCallback(
    (width: number, colours: ChartTheme) => ({
      width,
      theme: colours,
      fontScale: width < 480 ? 1.04 : 1.06,
      highestPlot: 760,
      ...(interval === undefined ? {} : { interval }),
      ...(cut.length > 0 ? { cut } : {}),
      ...(place ? { selected: place } : {}),
    }),
    [interval, cut, place],
  )
  // What is on the canvas now, for turning pixels back into coordinates.
  const shown = useRef<Layout | null>(null)
  const draw = useCallback(
    (width: number) => {
      const options = optionsFor(width, theme)
      shown.current = pictureLayout(input, options)
      return { option: headsPicture(input, options), height: shown.current.height }
    },
    [input, optionsFor, theme],
  )

  function read(at: [number, number] | null) {
    const layout = shown.current
    const ground = at && layout ? layout.toGround(...at) : null
    const head = ground ? headAt(figure.heads, ...ground) : Number.NaN
    if (!ground || !layout || !isInPlot(layout, at)) {
      setReading(null)
      onNear(null)
      return
    }
    setReading({
      x: ground[0],
      y: ground[1],
      head,
      drawdown: figure.drawdown ? headAt(figure.drawdown, ...ground) : null,
    })
    onNear(nearest(figure.features, ground, pointerReach / layout.scale))
  }

  function pick(at: [number, number]) {
    const layout = shown.current
    if (!layout || !isInPlot(layout, at)) return
    const [x, y] = layout.toGround(...at)
    const end: Vertex = [rounded(x, layout.scale), rounded(y, layout.scale)]
    const first = cut.length === 1 ? cut[0] : undefined
    setCut(first ? [first, end] : [end])
    if (first) setCutting(false)
  }

  async function savePng() {
    const printed = { ...input, caption }
    const { selected: _, ...asShown } = optionsFor(1000, 'print')
    const options = { ...asShown, fontScale: 1.1, highestPlot: 900 }
    const { height } = pictureLayout(printed, options)
    saveBlob(await pngOf(headsPicture(printed, options), 1000, Math.ceil(height)), `${figure.fileName}.png`)
  }

  return (
    <>
      <figure>
        <ContourChart draw={draw} label={caption} onHover={read} {...(cutting ? { onPick: pick } : {})} />
        <ReadingLine reading={reading} unit={figure.unit} hint={hintOf(cutting, cut)} />
        <figcaption className="mt-1 text-[0.93rem] text-flint-2">{caption}</figcaption>
      </figure>
      <div className="screen-only mt-2 flex flex-wrap gap-2">
        <Button
          look={cutting ? 'chosen' : 'quiet'}
          aria-pressed={cutting}
          onClick={() => {
            setCutting(!cutting)
            if (!cutting) setCut([])
          }}
        >
          {cutting ? 'Click both ends of the cut' : 'Cut by two clicks'}
        </Button>
        {cut.length > 0 && (
          <Button
            look="quiet"
            onClick={() => {
              setCut([])
              setCutting(false)
            }}
          >
            Take the cut away
          </Button>
        )}
        <Button look="quiet" onClick={savePng}>
          Figure as PNG
        </Button>
      </div>
      <CutForm key={cut.flat().join(' ')} cut={cut} unit={figure.unit} onCut={setCut} />
      {cut.length === 2 && <CutFigure figure={figure} cut={cut as [Vertex, Vertex]} theme={theme} />}
    </>
  )
}

function captionOf(figure: FigureOfRun, shows: 'head' | 'drawdown', interval: number | undefined): string {
  const contours =
    interval === undefined ? 'no head to contour' : `contours every ${formatNumber(interval)} ${figure.unit}`
  const what = shows === 'drawdown' ? `Drawdown from ${figure.against}` : 'Heads'
  const levels = shows === 'drawdown' ? '' : `; levels in ${figure.datum}`
  const state = figure.converged ? '' : ' The run did not converge: not for use.'
  return `Fig. 5.1 ${what}, ${figure.of}; ${contours}${levels}.${state}`
}

function hintOf(cutting: boolean, cut: readonly Vertex[]): string {
  if (!cutting) return 'Point at the plan to read the head.'
  return cut.length === 0 ? 'Click where the cut begins, A.' : 'Click where the cut ends, A′.'
}

type Layout = ReturnType<typeof pictureLayout>

function isInPlot({ plot }: Layout, at: [number, number] | null): boolean {
  if (!at) return false
  const [x, y] = at
  return x >= plot.left && x <= plot.left + plot.width && y >= plot.top && y <= plot.top + plot.height
}

/** A clicked coordinate, no finer than a pixel. */
function rounded(value: number, scale: number): number {
  const step = 10 ** Math.floor(Math.log10(1 / scale))
  return Number((Math.round(value / step) * step).toFixed(6))
}

function nearest({ points, wells }: PictureFeatures, [x, y]: Vertex, reach: number): string | null {
  let name: string | null = null
  let closest = reach
  for (const feature of [...points, ...wells]) {
    const distance = Math.hypot(feature.x - x, feature.y - y)
    if (distance < closest) {
      closest = distance
      name = feature.name
    }
  }
  return name
}

interface Reading {
  x: number
  y: number
  head: number
  drawdown: number | null
}

function ReadingLine({ reading, unit, hint }: { reading: Reading | null; unit: string; hint: string }) {
  return (
    <p className="screen-only mt-2 min-h-6 text-[0.93rem]" aria-live="off">
      {reading ? (
        <span className="flex flex-wrap gap-x-5">
          <span>
            <span className="text-flint-2">x</span> {formatNumber(reading.x, 1)}{' '}
            <span className="text-flint-2">y</span> {formatNumber(reading.y, 1)}
          </span>
          <span>
            <span className="text-flint-2">head</span>{' '}
            <b className="font-semibold">
              {Number.isNaN(reading.head)
                ? 'none: outside the model'
                : `${formatNumber(reading.head, 3)} ${unit}`}
            </b>
          </span>
          {reading.drawdown !== null && !Number.isNaN(reading.drawdown) && (
            <span>
              <span className="text-flint-2">drawdown</span>{' '}
              <b className="font-semibold">
                {formatNumber(reading.drawdown, 3)} {unit}
              </b>
            </span>
          )}
        </span>
      ) : (
        <span className="text-flint-2">{hint}</span>
      )}
    </p>
  )
}

const coordinateNames = ['x of A', 'y of A', 'x of A′', 'y of A′']

/** The cut by coordinates: for exact lines, and for those who do not use a pointer. */
function CutForm({
  cut,
  unit,
  onCut,
}: {
  cut: readonly Vertex[]
  unit: string
  onCut: (cut: Vertex[]) => void
}) {
  const id = useId()
  const [problem, setProblem] = useState('')
  function submit(event: FormEvent<HTMLFormElement>) {
    event.preventDefault()
    const data = new FormData(event.currentTarget)
    const typed = coordinateNames.map((name) => String(data.get(name) ?? '').trim())
    const [x1 = Number.NaN, y1 = Number.NaN, x2 = Number.NaN, y2 = Number.NaN] = typed.map((text) =>
      text === '' ? Number.NaN : Number(text.replace(/[\s\u00a0\u202f]/g, '').replace('−', '-')),
    )
    if ([x1, y1, x2, y2].some((value) => !Number.isFinite(value))) {
      setProblem('Give all four coordinates as numbers.')
      return
    }
    if (x1 === x2 && y1 === y2) {
      setProblem('A and A′ are the same place.')
      return
    }
    setProblem('')
    onCut([
      [x1, y1],
      [x2, y2],
    ])
  }
  return (
    <details className="screen-only mt-2 text-[0.93rem]">
      <summary className="text-flint-2">Cut by coordinates</summary>
      <form onSubmit={submit} className="mt-2 flex flex-wrap items-end gap-2" noValidate>
        {coordinateNames.map((name, k) => (
          <div key={name}>
            <label htmlFor={`${id}-${k}`} className="block text-[0.87rem] text-flint-2">
              {name}, {unit}
            </label>
            <input
              id={`${id}-${k}`}
              name={name}
              inputMode="decimal"
              defaultValue={cut[Math.floor(k / 2)]?.[k % 2] ?? ''}
              className="w-28 rounded border border-rule bg-chalk px-2 py-1"
              aria-invalid={problem !== '' || undefined}
              aria-describedby={problem ? `${id}-problem` : undefined}
            />
          </div>
        ))}
        <Button type="submit">Draw the cut</Button>
        {problem && (
          <p id={`${id}-problem`} role="alert" className="w-full text-madder">
            {problem}
          </p>
        )}
      </form>
    </details>
  )
}

function CutFigure({
  figure,
  cut,
  theme,
}: {
  figure: FigureOfRun
  cut: [Vertex, Vertex]
  theme: ChartTheme
}) {
  const [from, to] = cut
  const lines = useMemo((): CutLine[] => {
    const heads = cutThrough(figure.heads, from, to)
    const levelsOf = (samples: typeof heads) =>
      samples.map(({ distance, head }) => ({ distance, level: Number.isNaN(head) ? null : head }))
    const ground = heads.map(({ distance, x, y }) => ({ distance, ...figure.groundAt(x, y) }))
    const drawn: CutLine[] = [{ name: 'Head', look: 'head', samples: levelsOf(heads) }]
    if (figure.before) {
      drawn.push({
        name: `Head, ${figure.against}`,
        look: 'before',
        samples: levelsOf(cutThrough(figure.before, from, to)),
      })
    }
    for (const [name, key] of [
      ['Top of the ground modelled', 'top'],
      ['Base of the ground modelled', 'base'],
    ] as const) {
      if (ground.some((sample) => sample[key] !== null)) {
        drawn.push({
          name,
          look: 'ground',
          samples: ground.map((sample) => ({ distance: sample.distance, level: sample[key] })),
        })
      }
    }
    return drawn
  }, [figure, from, to])
  const [withGround, setWithGround] = useState(false)
  const draw = useCallback(
    (width: number) => ({
      option: cutChart(
        lines.filter((line) => withGround || line.look !== 'ground'),
        { unit: figure.unit, datum: figure.datum, theme, ...(width < 480 ? { fontScale: 0.95 } : {}) },
      ),
      height: 300,
    }),
    [lines, withGround, figure, theme],
  )
  const heads = lines[0]?.samples.flatMap(({ level }) => level ?? []) ?? []
  const caption = `Fig. 5.2 Heads along A–A′, from (${formatNumber(from[0])}, ${formatNumber(from[1])}) to (${formatNumber(to[0])}, ${formatNumber(to[1])}), ${figure.of}${figure.converged ? '' : ', not converged'}.`
  return (
    <figure className="mt-5">
      <ContourChart
        draw={draw}
        label={`${caption} ${heads.length > 0 ? `Lowest ${formatNumber(Math.min(...heads), 2)}, highest ${formatNumber(Math.max(...heads), 2)} ${figure.unit}.` : 'There is no head along it.'}`}
      />
      <figcaption className="mt-1 flex flex-wrap justify-between gap-x-4 text-[0.93rem] text-flint-2">
        {caption}
        <label className="screen-only flex items-center gap-1.5">
          <input
            type="checkbox"
            checked={withGround}
            onChange={(event) => setWithGround(event.target.checked)}
          />
          show base and top of the ground
        </label>
      </figcaption>
    </figure>
  )
}

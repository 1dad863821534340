import { type KeyboardEvent, type MouseEvent, useEffect, useId, useRef, useState } from 'react'
import { Button } from '~/components/button'
import { Notice } from '~/components/notice'
import { formatNumber } from '~/units'
import {
  type DrawnFeature,
  type DrawnGeometry,
  type DrawnKind,
  type Extent,
  extentAbout,
  roundLength,
  shapeOf,
  verticesOf,
} from './drawing/drawn-feature'
import { FeaturePicker, GeometryForm } from './drawing/geometry-form'
import type { ShownPlanImage } from './drawing/plan-image-layer'
import type { SiteMap, SiteTool } from './drawing/site-map'
import { kindWords } from './drawing/words'
import { planImageCorners, planImagePlacement } from './plan-image'

export interface SiteDrawingProps {
  features: readonly DrawnFeature[]
  selectedId?: string | null
  hoveredId?: string | null
  onSelect: (id: string | null) => void
  onHover: (id: string | null) => void
  /** A row was moved, reshaped or typed; without it nothing can be changed. */
  onChange?: (id: string, geometry: DrawnGeometry) => void
  /** A new geometry was drawn or typed. */
  onDraw?: (kind: DrawnKind, geometry: DrawnGeometry) => void
  onDelete?: (id: string) => void
  /** What may be drawn here, in the order of the toolbar. */
  tools?: readonly DrawnKind[]
  readOnly?: boolean
  /** What "fit to view" shows; all rows and the plan image when left out. */
  extent?: Extent | null
  planImage?: ShownPlanImage | null
  lengthUnit: 'm' | 'ft'
  /** Height in pixels; less on a low or narrow screen. */
  height?: number
}

function everything(features: readonly DrawnFeature[], image: ShownPlanImage | null | undefined) {
  const shown = features.map((feature) => feature.geometry)
  if (image) {
    const corners = planImageCorners(planImagePlacement(image.control), image.width, image.height)
    shown.push({ type: 'polygon', vertices: corners })
  }
  return extentAbout(shown)
}

function hintFor(tool: SiteTool): string {
  switch (tool.name) {
    case 'select':
      return 'Click a row to select it. Arrow keys pan, + and − zoom.'
    case 'move':
      return 'Drag a row to move it whole.'
    case 'reshape':
      return 'Drag a vertex of the selected row, or a place between two. Alt-click takes a vertex out.'
    case 'measure':
      return 'Click along the line; double-click ends it. Escape clears it.'
    case 'draw':
      if (tool.kind === 'extent') return 'Click one corner, then the opposite one.'
      return shapeOf(tool.kind) === 'point'
        ? 'Click where it lies. Escape ends.'
        : 'Click each vertex; double-click ends. Backspace takes one back, Escape cancels.'
  }
}

/** The rows of a sheet as a drawing of the site, in project coordinates. Select or hover here and the sheet follows. */
export function SiteDrawing(props: SiteDrawingProps) {
  const { features, selectedId = null, hoveredId = null, planImage, extent, lengthUnit } = props
  const { height = 480, tools = [] } = props
  const changeable = !props.readOnly && props.onChange !== undefined
  const drawable = props.readOnly || !props.onDraw ? [] : tools
  const target = useRef<HTMLDivElement>(null)
  const coordinates = useRef<HTMLSpanElement>(null)
  const site = useRef<SiteMap | null>(null)
  const latest = useRef(props)
  latest.current = props
  const fitted = useRef(false)
  const helpId = useId()
  const [ready, setReady] = useState(false)
  const [failed, setFailed] = useState(false)
  const [tool, setTool] = useState<SiteTool>({ name: 'select' })
  const [resolution, setResolution] = useState(1)
  const [measured, setMeasured] = useState<{ length: number; stretch: number } | null>(null)
  const [trouble, setTrouble] = useState('')
  // Counts answers of the page, so that a change it didn't take is drawn back.
  const [answers, setAnswers] = useState(0)

  const selected = features.find((feature) => feature.id === selectedId && !feature.muted)

  useEffect(() => {
    const element = target.current
    if (!element) return
    let live = true
    import('./drawing/site-map')
      .then(({ createSiteMap }) => {
        if (!live) return
        site.current = createSiteMap(element, {
          onSelect: (id) => latest.current.onSelect(id),
          onHover: (id) => latest.current.onHover(id),
          onChange: (id, geometry) => {
            setTrouble('')
            latest.current.onChange?.(id, geometry)
            setAnswers((count) => count + 1)
          },
          onDraw: (kind, geometry) => {
            setTrouble('')
            latest.current.onDraw?.(kind, geometry)
            // Several points are set one after the other; a line or an area wants its row filled in first.
            if (shapeOf(kind) !== 'point') setTool({ name: 'select' })
          },
          onPointer: (at, decimals) => {
            if (!coordinates.current) return
            coordinates.current.textContent = at
              ? `x ${formatNumber(at[0], decimals)}  y ${formatNumber(at[1], decimals)} ${latest.current.lengthUnit}`
              : ''
          },
          onScale: setResolution,
          onMeasure: (length, stretch) => setMeasured(length === null ? null : { length, stretch }),
          onTrouble: setTrouble,
        })
        setReady(true)
      })
      .catch((error: unknown) => {
        console.error(error)
        if (live) setFailed(true)
      })
    return () => {
      live = false
      site.current?.destroy()
      site.current = null
    }
  }, [])

  // biome-ignore lint/correctness/useExhaustiveDependencies: an answer of the page draws the rows anew
  useEffect(() => {
    if (ready) site.current?.setFeatures(features)
  }, [ready, features, answers])

  useEffect(() => {
    if (ready) site.current?.setPlanImage(planImage ?? null)
  }, [ready, planImage])

  useEffect(() => {
    if (ready) site.current?.setTool(tool)
    setMeasured(null)
  }, [ready, tool])

  useEffect(() => {
    if (ready) site.current?.setChoice(selectedId, hoveredId)
  }, [ready, selectedId, hoveredId])

  useEffect(() => {
    const wanted = extent ?? everything(features, planImage)
    if (!ready || fitted.current || !wanted) return
    fitted.current = true
    site.current?.show(wanted)
  }, [ready, extent, features, planImage])

  function choose(next: SiteTool, event: MouseEvent) {
    setTrouble('')
    setTool(next)
    // Whoever clicked goes on in the drawing; whoever pressed a key stays in the toolbar.
    if (event.detail > 0) target.current?.focus({ preventScroll: true })
  }

  function fit() {
    const wanted = extent ?? everything(features, planImage)
    if (wanted) site.current?.show(wanted)
  }

  function onKeyDown(event: KeyboardEvent) {
    if (event.key === 'Escape') {
      if (site.current?.abandon()) return
      if (tool.name !== 'select') setTool({ name: 'select' })
      else props.onSelect(null)
    } else if (event.key === 'Delete' || event.key === 'Backspace') {
      event.preventDefault()
      if (tool.name === 'draw' || tool.name === 'measure') site.current?.stepBack()
      else if (selected && changeable) props.onDelete?.(selected.id)
    }
  }

  const toolButton = (next: SiteTool, word: string) => {
    const chosen =
      tool.name === next.name && (next.name !== 'draw' || tool.name !== 'draw' || tool.kind === next.kind)
    return (
      <Button
        key={word}
        look={chosen ? 'chosen' : 'quiet'}
        aria-pressed={chosen}
        disabled={!ready}
        onClick={(event) => choose(next, event)}
      >
        {word}
      </Button>
    )
  }

  const barLength = roundLength(110 * resolution)
  return (
    <figure className="m-0">
      <div role="toolbar" aria-label="Drawing tools" className="screen-only mb-2 flex flex-wrap gap-1.5">
        {toolButton({ name: 'select' }, 'Select')}
        {changeable && toolButton({ name: 'move' }, 'Move')}
        {changeable && toolButton({ name: 'reshape' }, 'Reshape')}
        {drawable.length > 0 && (
          <span className="ml-1 self-center text-[0.87rem] text-flint-2" aria-hidden>
            Draw
          </span>
        )}
        {drawable.map((kind) => toolButton({ name: 'draw', kind }, kindWords[kind]))}
        <span className="mx-0.5" aria-hidden />
        {toolButton({ name: 'measure' }, 'Measure')}
        <Button look="quiet" disabled={!ready} onClick={fit}>
          Fit to view
        </Button>
      </div>
      <div className="relative border-[1.5px] border-flint bg-chalk">
        <div
          ref={target}
          role="application"
          aria-label="Drawing of the site"
          aria-describedby={helpId}
          // biome-ignore lint/a11y/noNoninteractiveTabindex: the drawing takes keys to pan and zoom
          tabIndex={0}
          className="outline-offset-[-2px]"
          style={{ height: `min(${height}px, 70svh, max(300px, 85vw))` }}
          onKeyDown={onKeyDown}
        />
        {!ready && (
          <p className="absolute inset-0 m-auto h-6 text-center text-flint-2" role="status">
            {failed ? '' : 'The drawing is being laid out …'}
          </p>
        )}
        <div className="screen-only absolute top-2 left-2 z-10 flex flex-col gap-1">
          {[
            { sign: '+', word: 'Zoom in', steps: 1 },
            { sign: '−', word: 'Zoom out', steps: -1 },
          ].map(({ sign, word, steps }) => (
            <button
              key={word}
              type="button"
              aria-label={word}
              disabled={!ready}
              className="size-8 rounded border border-rule bg-chalk text-lg leading-none text-flint"
              onClick={() => site.current?.zoom(steps)}
            >
              {sign}
            </button>
          ))}
        </div>
        <NorthArrow />
        {ready && (
          <div
            className="pointer-events-none absolute bottom-2 left-2 z-10 bg-chalk/85 px-1.5 pt-0.5 pb-1 text-[0.8rem] text-flint"
            role="img"
            aria-label={`Scale bar of ${formatNumber(barLength, barLength < 1 ? 2 : 0)} ${lengthUnit}`}
          >
            <span className="block text-center leading-tight">
              {formatNumber(barLength, barLength < 1 ? 2 : 0)} {lengthUnit}
            </span>
            <span
              className="block h-1.5 border-x-[1.5px] border-b-[1.5px] border-flint"
              style={{ width: `${barLength / resolution}px` }}
            />
          </div>
        )}
      </div>
      {failed && (
        <Notice tone="alarm" title="The drawing could not be loaded.">
          The rows are safe. Load the page again; the sheet works without the drawing.
        </Notice>
      )}
      <div className="screen-only flex min-h-6 flex-wrap justify-between gap-x-4 py-1 text-[0.87rem] text-flint-2">
        <span id={helpId}>
          {measured
            ? `Length ${formatNumber(measured.length, 1)} ${lengthUnit}, last stretch ${formatNumber(measured.stretch, 1)} ${lengthUnit}.`
            : hintFor(tool)}
        </span>
        <span ref={coordinates} className="whitespace-pre text-flint" />
      </div>
      {trouble && (
        <Notice tone="warn" live>
          {trouble} The row stays as it was.
        </Notice>
      )}
      <p className="sr-only" role="status">
        {selected ? describe(selected, lengthUnit) : ''}
      </p>
      <div className="screen-only mt-1 flex flex-wrap items-end gap-x-4 gap-y-2">
        {tool.name === 'draw' && props.onDraw ? (
          <GeometryForm
            key={`new ${tool.kind} ${features.length}`}
            kind={tool.kind}
            geometry={null}
            lengthUnit={lengthUnit}
            readOnly={false}
            action={`Add ${kindWords[tool.kind].toLowerCase()}`}
            onApply={(geometry) => {
              props.onDraw?.(tool.kind, geometry)
              if (shapeOf(tool.kind) !== 'point') setTool({ name: 'select' })
            }}
          />
        ) : (
          <>
            <FeaturePicker features={features} selectedId={selectedId} onSelect={props.onSelect} />
            {selected && (
              <GeometryForm
                key={`${selected.id} ${JSON.stringify(selected.geometry)}`}
                kind={selected.kind}
                geometry={selected.geometry}
                lengthUnit={lengthUnit}
                readOnly={!changeable}
                action="Place"
                onApply={(geometry) => props.onChange?.(selected.id, geometry)}
              />
            )}
            {selected && changeable && props.onDelete && (
              <Button look="danger" onClick={() => props.onDelete?.(selected.id)}>
                Delete {selected.label}
              </Button>
            )}
          </>
        )}
      </div>
    </figure>
  )
}

function describe(feature: DrawnFeature, unit: string): string {
  const vertices = verticesOf(feature.geometry)
  const [x = 0, y = 0] = vertices[0] ?? []
  const place =
    feature.geometry.type === 'point'
      ? `x ${x}, y ${y} ${unit}`
      : `${vertices.length} vertices, from x ${x}, y ${y} ${unit}`
  return `${kindWords[feature.kind]} ${feature.label} is selected: ${place}.`
}

function NorthArrow() {
  return (
    <svg
      role="img"
      aria-label="North is up"
      viewBox="0 0 24 40"
      className="pointer-events-none absolute top-2 right-2 z-10 h-10 w-6 bg-chalk/85"
    >
      <path d="M12 3 L17.5 24 L12 20 L6.5 24 Z" className="fill-flint" />
      <text x="12" y="37" textAnchor="middle" className="fill-flint text-[12px] font-semibold">
        N
      </text>
    </svg>
  )
}

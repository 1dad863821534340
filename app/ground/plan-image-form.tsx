import { type FormEvent, type KeyboardEvent, type MouseEvent, useId, useRef, useState } from 'react'
import { Button } from '~/components/button'
import { Notice } from '~/components/notice'
import { type UploadedPicture, uploadPicture } from '~/files/upload'
import { formatNumber } from '~/units'
import { type PlanImage, planImageSchema } from './ground'
import { planImagePlacement } from './plan-image'

export interface PlanImageFormProps {
  planImage: PlanImage | null
  /** Where a picture is sent: /projects/ID/files. */
  uploadAddress: string
  fileAddress: (fileId: number) => string
  lengthUnit: 'm' | 'ft'
  readOnly?: boolean
  /** The body of the row of kind 'plan image', checked by its schema. */
  onSave: (body: PlanImage) => void
  onRemove?: () => void
}

interface TypedPoint {
  column: string
  row: string
  x: string
  y: string
}

const names = ['A', 'B'] as const
type PointIndex = 0 | 1
const blank: TypedPoint = { column: '', row: '', x: '', y: '' }
const box =
  'w-full rounded border border-rule bg-chalk px-2 py-1 text-right text-flint aria-invalid:border-madder'

function typed(planImage: PlanImage | null): [TypedPoint, TypedPoint] {
  if (!planImage) return [blank, blank]
  const [a, b] = planImage.control.map((point) => ({
    column: String(point.column),
    row: String(point.row),
    x: String(point.x),
    y: String(point.y),
  }))
  return [a ?? blank, b ?? blank]
}

function numberIn(text: string): number {
  const tidy = text.trim().replace('−', '-').replace(',', '.')
  return tidy === '' ? Number.NaN : Number(tidy)
}

/** What the form would save, or what is still wanting in words. */
function bodyOf(
  picture: UploadedPicture | null,
  points: [TypedPoint, TypedPoint],
  opacity: number,
): { body: PlanImage } | { wanting: string } {
  if (!picture) return { wanting: 'Choose a picture first.' }
  const control = points.map(({ column, row, x, y }) => ({
    column: numberIn(column),
    row: numberIn(row),
    x: numberIn(x),
    y: numberIn(y),
  }))
  for (const [i, point] of control.entries()) {
    if (Number.isNaN(point.column) || Number.isNaN(point.row)) {
      return {
        wanting: `Show where point ${names[i]} is: click it in the picture, or type its column and row.`,
      }
    }
    if (Number.isNaN(point.x) || Number.isNaN(point.y)) {
      return { wanting: `Type the coordinates x and y of point ${names[i]}.` }
    }
  }
  const checked = planImageSchema.safeParse({ ...picture, control, opacity })
  return checked.success
    ? { body: checked.data }
    : { wanting: checked.error.issues[0]?.message ?? 'This placement cannot stand.' }
}

/**
 * Uploads the plan image that lies under the drawing and places it: two spots known both in the picture and in the
 * project's coordinates.
 */
export function PlanImageForm(props: PlanImageFormProps) {
  const { planImage, lengthUnit, readOnly = false } = props
  const id = useId()
  const fileInput = useRef<HTMLInputElement>(null)
  const [picture, setPicture] = useState<UploadedPicture | null>(
    planImage && { fileId: planImage.fileId, width: planImage.width, height: planImage.height },
  )
  const [points, setPoints] = useState(typed(planImage))
  const [opacity, setOpacity] = useState(planImage?.opacity ?? 0.6)
  const [active, setActive] = useState<PointIndex>(0)
  const [magnified, setMagnified] = useState(1)
  const [progress, setProgress] = useState<number | null>(null)
  const [problem, setProblem] = useState('')

  const outcome = bodyOf(picture, points, opacity)
  const body = 'body' in outcome ? outcome.body : null

  function put(index: PointIndex, part: Partial<TypedPoint>) {
    setProblem('')
    setPoints(
      (before) =>
        before.map((point, i) => (i === index ? { ...point, ...part } : point)) as [TypedPoint, TypedPoint],
    )
  }

  async function upload(file: File | undefined) {
    if (!file) return
    setProblem('')
    setProgress(0)
    try {
      const taken = await uploadPicture(props.uploadAddress, file, setProgress)
      // A newer print of the same sheet keeps its known points.
      if (picture?.width !== taken.width || picture.height !== taken.height) setPoints([blank, blank])
      setPicture(taken)
      setActive(0)
    } catch (error) {
      if (!(error instanceof Error)) throw error
      setProblem(error.message)
    } finally {
      setProgress(null)
      if (fileInput.current) fileInput.current.value = ''
    }
  }

  function clickPicture(event: MouseEvent<HTMLButtonElement>) {
    // A key press on the button is no place in the picture.
    if (!picture || readOnly || event.detail === 0) return
    const shown = event.currentTarget.getBoundingClientRect()
    const column = ((event.clientX - shown.left) / shown.width) * picture.width
    const row = ((event.clientY - shown.top) / shown.height) * picture.height
    put(active, { column: column.toFixed(1), row: row.toFixed(1) })
    if (active === 0 && points[1].column === '') setActive(1)
  }

  function nudge(event: KeyboardEvent) {
    const step = event.shiftKey ? 10 : 1
    const moves: Record<string, [number, number]> = {
      ArrowLeft: [-step, 0],
      ArrowRight: [step, 0],
      ArrowUp: [0, -step],
      ArrowDown: [0, step],
    }
    const move = moves[event.key]
    if (!move || !picture || readOnly) return
    event.preventDefault()
    const { column, row } = points[active]
    const within = (text: string, by: number, size: number) => {
      const from = numberIn(text)
      return String(Math.max(0, Math.min(size, (Number.isNaN(from) ? size / 2 : from) + by)))
    }
    put(active, { column: within(column, move[0], picture.width), row: within(row, move[1], picture.height) })
  }

  function save(event: FormEvent) {
    event.preventDefault()
    if ('wanting' in outcome) setProblem(outcome.wanting)
    else props.onSave(outcome.body)
  }

  return (
    <form onSubmit={save} noValidate className="max-w-[52rem]">
      {!readOnly && (
        <div className="flex flex-wrap items-center gap-3">
          <input
            ref={fileInput}
            id={`${id}-file`}
            type="file"
            accept="image/png,image/jpeg"
            className="sr-only"
            tabIndex={-1}
            aria-hidden
            onChange={(event) => void upload(event.target.files?.[0])}
          />
          <Button disabled={progress !== null} onClick={() => fileInput.current?.click()}>
            {picture ? 'Replace the picture' : 'Choose a picture'}
          </Button>
          {picture && props.onRemove && (
            <Button look="danger" onClick={props.onRemove}>
              Remove the plan image
            </Button>
          )}
          <span className="text-[0.87rem] text-flint-2">
            PNG or JPEG, at most 20 MB and 40 million pixels.
          </span>
        </div>
      )}
      {progress !== null && (
        <p className="mt-2 flex items-center gap-3" role="status">
          <progress className="w-56 accent-bourne" value={progress} aria-label="Upload of the picture" />
          {progress < 1 ? `${Math.round(progress * 100)} % sent` : 'being checked …'}
        </p>
      )}
      {problem && (
        <Notice tone="alarm" live>
          {problem}
        </Notice>
      )}
      {picture && (
        <>
          <p className="mt-3 text-[0.95rem]">
            {readOnly
              ? 'The picture lies by these two known points.'
              : 'Choose a point, click its spot in the picture, and type its coordinates. Two spots far apart place it best.'}
          </p>
          <div className="mt-2 grid gap-x-6 gap-y-3 sm:grid-cols-2">
            {names.map((name, index) => (
              <KnownPoint
                key={name}
                name={name}
                point={points[index] as TypedPoint}
                lengthUnit={lengthUnit}
                readOnly={readOnly}
                active={active === index}
                onActivate={() => setActive(index as PointIndex)}
                onPut={(part) => put(index as PointIndex, part)}
              />
            ))}
          </div>
          <div className="mt-3 flex flex-wrap items-center gap-1.5">
            {[1, 2, 4].map((times) => (
              <Button
                key={times}
                look={magnified === times ? 'chosen' : 'quiet'}
                aria-pressed={magnified === times}
                onClick={() => setMagnified(times)}
              >
                {times === 1 ? 'Whole picture' : `${times} times`}
              </Button>
            ))}
          </div>
          <div className="mt-2 max-h-[26rem] overflow-auto border border-rule bg-chalk-2">
            <button
              type="button"
              className="relative block cursor-crosshair"
              style={{ width: `${magnified * 100}%` }}
              aria-label={`Picture. Arrow keys move point ${names[active]} by a pixel, with Shift by ten.`}
              onClick={clickPicture}
              onKeyDown={nudge}
            >
              <img
                src={props.fileAddress(picture.fileId)}
                alt="Plan to be placed"
                className="block w-full select-none"
                draggable={false}
              />
              {points.map((point, index) => (
                <Mark
                  key={names[index]}
                  name={names[index] as string}
                  across={numberIn(point.column) / picture.width}
                  down={numberIn(point.row) / picture.height}
                  active={active === index}
                />
              ))}
            </button>
          </div>
          <div className="mt-3 flex flex-wrap items-center gap-x-6 gap-y-2">
            <label className="flex items-center gap-2 text-[0.95rem]">
              Opacity
              <input
                type="range"
                className="accent-bourne"
                min={10}
                max={100}
                step={5}
                disabled={readOnly}
                value={Math.round(opacity * 100)}
                onChange={(event) => setOpacity(Number(event.target.value) / 100)}
              />
              <span className="w-12">{Math.round(opacity * 100)} %</span>
            </label>
            <span className="text-[0.95rem] text-flint-2" role="status">
              {body ? placedIn(body, lengthUnit) : ''}
            </span>
          </div>
          {!readOnly && (
            <p className="mt-3">
              <Button type="submit" look="primary">
                Place under the drawing
              </Button>
            </p>
          )}
        </>
      )}
    </form>
  )
}

/** The outcome in numbers that somebody can judge: a plan of 3 km is no plan of a shaft. */
function placedIn(body: PlanImage, unit: string): string {
  const { pixelSize, turn } = planImagePlacement(body.control)
  const degrees = (turn * 180) / Math.PI
  const turned = Math.abs(degrees) < 0.05 ? 'not turned' : `turned ${formatNumber(degrees, 1)}° anticlockwise`
  const size = `${formatNumber(body.width * pixelSize)} by ${formatNumber(body.height * pixelSize)} ${unit}`
  return `A pixel is ${formatNumber(pixelSize)} ${unit}; the picture covers ${size}, ${turned}.`
}

function KnownPoint({
  name,
  point,
  lengthUnit,
  readOnly,
  active,
  onActivate,
  onPut,
}: {
  name: string
  point: TypedPoint
  lengthUnit: string
  readOnly: boolean
  active: boolean
  onActivate: () => void
  onPut: (part: Partial<TypedPoint>) => void
}) {
  const id = useId()
  const fields: { key: keyof TypedPoint; label: string; unit: string }[] = [
    { key: 'column', label: 'Column', unit: 'pixel' },
    { key: 'row', label: 'Row', unit: 'pixel' },
    { key: 'x', label: 'x', unit: lengthUnit },
    { key: 'y', label: 'y', unit: lengthUnit },
  ]
  return (
    <fieldset className={`border-l-[3px] pl-3 ${active ? 'border-bourne' : 'border-rule'}`}>
      <legend className="sr-only">Known point {name}</legend>
      <label className="mb-1 flex items-center gap-2 font-semibold">
        <input
          type="radio"
          className="accent-bourne"
          checked={active}
          disabled={readOnly}
          onChange={onActivate}
        />
        Point {name}
      </label>
      <div className="grid grid-cols-2 gap-2">
        {fields.map(({ key, label, unit }) => (
          <div key={key}>
            <label
              htmlFor={`${id}-${key}`}
              className="mb-0.5 block text-[0.87rem] font-semibold text-flint-2"
            >
              {label} <span className="font-normal">{unit}</span>
            </label>
            <input
              id={`${id}-${key}`}
              className={box}
              inputMode="decimal"
              autoComplete="off"
              readOnly={readOnly}
              value={point[key]}
              aria-invalid={point[key] !== '' && !Number.isFinite(numberIn(point[key])) ? true : undefined}
              onFocus={onActivate}
              onChange={(event) => onPut({ [key]: event.target.value })}
            />
          </div>
        ))}
      </div>
    </fieldset>
  )
}

/** A ring with a cross hair on the picture, and the point's letter. */
function Mark({
  name,
  across,
  down,
  active,
}: {
  name: string
  across: number
  down: number
  active: boolean
}) {
  if (!Number.isFinite(across) || !Number.isFinite(down)) return null
  return (
    <svg
      aria-hidden
      viewBox="-24 -24 48 48"
      className={`pointer-events-none absolute size-12 -translate-x-1/2 -translate-y-1/2 ${active ? 'text-[#a3201a]' : 'text-[#14505a]'}`}
      style={{ left: `${across * 100}%`, top: `${down * 100}%` }}
    >
      <circle r="10" fill="none" stroke="#fff" strokeWidth="5" opacity="0.8" />
      <circle r="10" fill="none" stroke="currentColor" strokeWidth="2" />
      <path d="M-16 0H16M0 -16V16" stroke="currentColor" strokeWidth="1.2" />
      <text
        x="14"
        y="-10"
        fill="currentColor"
        stroke="#fff"
        strokeWidth="3"
        paintOrder="stroke"
        className="text-[14px] font-bold"
      >
        {name}
      </text>
    </svg>
  )
}

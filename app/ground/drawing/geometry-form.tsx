import { type FormEvent, useId, useState } from 'react'
import { Button } from '~/components/button'
import {
  type DrawnFeature,
  type DrawnGeometry,
  type DrawnKind,
  geometryOf,
  geometryProblem,
  shapeOf,
  verticesOf,
} from './drawn-feature'
import { parseVertices, typedVertices } from './typed-vertices'
import { kindWords } from './words'

const box =
  'rounded border border-rule bg-chalk px-2 py-1 text-flint aria-invalid:border-madder read-only:bg-chalk-2'

/** The selected row picked by name, for whoever doesn't use a pointer. */
export function FeaturePicker({
  features,
  selectedId,
  onSelect,
}: {
  features: readonly DrawnFeature[]
  selectedId: string | null
  onSelect: (id: string | null) => void
}) {
  const id = useId()
  const shown = features.filter((feature) => !feature.muted)
  const kinds = [...new Set(shown.map((feature) => feature.kind))]
  return (
    <div>
      <label htmlFor={id} className="mb-0.5 block text-[0.87rem] font-semibold text-flint-2">
        Selected
      </label>
      <select
        id={id}
        className={`${box} max-w-[15rem]`}
        value={shown.some((feature) => feature.id === selectedId) ? (selectedId ?? '') : ''}
        onChange={(event) => onSelect(event.target.value || null)}
      >
        <option value="">nothing</option>
        {kinds.map((kind) => (
          <optgroup key={kind} label={kindWords[kind]}>
            {shown
              .filter((feature) => feature.kind === kind)
              .map((feature) => (
                <option key={feature.id} value={feature.id}>
                  {feature.label}
                </option>
              ))}
          </optgroup>
        ))}
      </select>
    </div>
  )
}

/**
 * The coordinates of one row as numbers: two for a point, a line each for the vertices of anything else.
 * Give it a key that changes with the geometry, so that it starts from the row in force.
 */
export function GeometryForm({
  kind,
  geometry,
  lengthUnit,
  readOnly,
  action,
  onApply,
}: {
  kind: DrawnKind
  geometry: DrawnGeometry | null
  lengthUnit: string
  readOnly: boolean
  action: string
  onApply: (geometry: DrawnGeometry) => void
}) {
  const id = useId()
  const type = geometry?.type ?? shapeOf(kind)
  const before = geometry ? verticesOf(geometry) : []
  const [x, setX] = useState(before[0] ? String(before[0][0]) : '')
  const [y, setY] = useState(before[0] ? String(before[0][1]) : '')
  const [lines, setLines] = useState(typedVertices(before))
  const [problem, setProblem] = useState('')

  function apply(event: FormEvent) {
    event.preventDefault()
    const parsed = parseVertices(type === 'point' ? `${x.trim()}\t${y.trim()}` : lines)
    if (!parsed.ok) {
      setProblem(type === 'point' ? 'Write a number for x and one for y.' : parsed.message)
      return
    }
    const typed = geometryOf(type, parsed.vertices)
    const wrong = typed ? geometryProblem(typed) : 'A coordinate is needed.'
    setProblem(wrong ?? '')
    if (typed && !wrong) onApply(typed)
  }

  const described = problem ? `${id}-problem` : undefined
  return (
    <form onSubmit={apply} className="flex flex-wrap items-end gap-x-3 gap-y-2" noValidate>
      {type === 'point' ? (
        [
          { axis: 'x', value: x, set: setX },
          { axis: 'y', value: y, set: setY },
        ].map(({ axis, value, set }) => (
          <div key={axis}>
            <label
              htmlFor={`${id}-${axis}`}
              className="mb-0.5 block text-[0.87rem] font-semibold text-flint-2"
            >
              {axis} <span className="font-normal">{lengthUnit}</span>
            </label>
            <input
              id={`${id}-${axis}`}
              className={`${box} w-[8.5rem] text-right`}
              inputMode="decimal"
              autoComplete="off"
              value={value}
              readOnly={readOnly}
              aria-invalid={problem ? true : undefined}
              aria-describedby={described}
              onChange={(event) => set(event.target.value)}
            />
          </div>
        ))
      ) : (
        <div>
          <label htmlFor={`${id}-lines`} className="mb-0.5 block text-[0.87rem] font-semibold text-flint-2">
            Vertices <span className="font-normal">x, y in {lengthUnit}, one a line</span>
          </label>
          <textarea
            id={`${id}-lines`}
            className={`${box} block w-[17rem] max-w-full font-[inherit]`}
            rows={Math.max(3, Math.min(6, lines.split('\n').length))}
            spellCheck={false}
            value={lines}
            readOnly={readOnly}
            aria-invalid={problem ? true : undefined}
            aria-describedby={described}
            onChange={(event) => setLines(event.target.value)}
          />
        </div>
      )}
      {!readOnly && (
        <Button type="submit" look="plain">
          {action}
        </Button>
      )}
      {problem && (
        <p id={`${id}-problem`} role="alert" className="basis-full text-[0.87rem] font-semibold text-madder">
          {problem}
        </p>
      )}
    </form>
  )
}

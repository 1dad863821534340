import { useState } from 'react'
import { Button } from '~/components/button'
import { Notice } from '~/components/notice'
import { cellText, headerUnit, type SheetColumn } from '~/components/sheet-cells'
import type { ProjectUnits } from '~/units'
import { type Body, type DraftConflict, sameBody } from './rows-store'
import type { RowsEditor } from './use-rows'

interface ConflictPanelProps {
  book: RowsEditor
  units: ProjectUnits
  /** Columns of each kind on the page, for the names of the fields. */
  columns: Readonly<Record<string, readonly SheetColumn[]>>
}

/** Two people changed the same row. Both values stand side by side, field by field, until one of them is chosen. */
export function ConflictPanel({ book, units, columns }: ConflictPanelProps) {
  return book.conflicts.map((conflict) => (
    <Conflict
      key={`${conflict.id} ${conflict.theirs?.version}`}
      conflict={conflict}
      units={units}
      columns={columns[conflict.kind] ?? []}
      onResolve={(body) => book.resolve(conflict.id, body)}
    />
  ))
}

interface ConflictProps {
  conflict: DraftConflict
  units: ProjectUnits
  columns: readonly SheetColumn[]
  onResolve: (body: Body | null) => void
}

const clock = new Intl.DateTimeFormat('en-GB', {
  day: 'numeric',
  month: 'short',
  hour: '2-digit',
  minute: '2-digit',
})

function Conflict({ conflict, units, columns, onResolve }: ConflictProps) {
  const { base, theirs, mine, kind } = conflict
  const name = String((mine ?? theirs?.body ?? base)?.[columns[0]?.field ?? ''] ?? '')
  if (!theirs) {
    return (
      <Notice tone="warn" live title={`Somebody deleted ${kind} ${name} while you were changing it.`}>
        <Choices
          mine="Keep mine: put it back"
          theirs="Take theirs: let it go"
          onMine={() => onResolve(mine)}
          onTheirs={() => onResolve(null)}
        />
      </Notice>
    )
  }
  const who = `${theirs.by}, ${clock.format(new Date(theirs.at))}`
  if (!mine) {
    return (
      <Notice tone="warn" live title={`${kind} ${name} was changed (${who}) while you deleted it.`}>
        <Choices
          mine="Keep mine: delete it"
          theirs="Take theirs: keep it"
          onMine={() => onResolve(null)}
          onTheirs={() => onResolve(theirs.body)}
        />
      </Notice>
    )
  }
  return <FieldByField {...{ base, mine, theirs: theirs.body, who, kind, name, columns, units, onResolve }} />
}

function Choices(props: { mine: string; theirs: string; onMine: () => void; onTheirs: () => void }) {
  return (
    <p className="mt-2 flex flex-wrap gap-2">
      <Button onClick={props.onMine}>{props.mine}</Button>
      <Button onClick={props.onTheirs}>{props.theirs}</Button>
    </p>
  )
}

interface FieldByFieldProps {
  base: Body | null
  mine: Body
  theirs: Body
  who: string
  kind: string
  name: string
  columns: readonly SheetColumn[]
  units: ProjectUnits
  onResolve: (body: Body) => void
}

function FieldByField(props: FieldByFieldProps) {
  const { base, mine, theirs, who, kind, name, columns, units, onResolve } = props
  const fields = [...new Set([...Object.keys(theirs), ...Object.keys(mine)])].filter(
    (field) => !sameBody(mine[field], theirs[field]),
  )
  const [chosen, setChosen] = useState<Readonly<Record<string, 'mine' | 'theirs'>>>({})

  /** Until somebody chooses, what only one of the two touched stays as that person left it. */
  function keepsMine(field: string): boolean {
    const choice = chosen[field] ?? (!base || !sameBody(mine[field], base[field]) ? 'mine' : 'theirs')
    return choice === 'mine'
  }

  function words(field: string, body: Body): string {
    const column = columns.find((one) => one.field === field)
    const text = column ? cellText(column, body[field], units) : JSON.stringify(body[field] ?? null)
    const unit = column ? headerUnit(column, units) : ''
    if (text === '') return 'blank'
    return unit && /\d$/.test(text) ? `${text} ${unit}` : text
  }

  return (
    <Notice tone="warn" live title={`You and somebody else (${who}) changed ${kind} ${name}.`}>
      <p>Nothing is lost: choose for each field, then use what you chose.</p>
      <table className="mt-2 w-full max-w-3xl border-collapse text-[0.93rem]">
        <thead>
          <tr className="border-b border-rule text-left">
            <th scope="col" className="py-1 pr-3 font-semibold">
              Field
            </th>
            <th scope="col" className="py-1 pr-3 font-semibold">
              Mine
            </th>
            <th scope="col" className="py-1 font-semibold">
              Theirs
            </th>
          </tr>
        </thead>
        <tbody>
          {fields.map((field) => (
            <tr key={field} className="border-b border-rule align-top">
              <th scope="row" className="py-1 pr-3 text-left font-normal">
                {columns.find((one) => one.field === field)?.label ?? field}
              </th>
              {([true, false] as const).map((isMine) => (
                <td key={String(isMine)} className="py-1 pr-3">
                  <label className="flex gap-1.5">
                    <input
                      type="radio"
                      name={`${kind} ${name} ${field}`}
                      checked={keepsMine(field) === isMine}
                      onChange={() => setChosen({ ...chosen, [field]: isMine ? 'mine' : 'theirs' })}
                    />
                    <span className="break-words whitespace-pre-line">
                      {words(field, isMine ? mine : theirs)}
                    </span>
                  </label>
                </td>
              ))}
            </tr>
          ))}
        </tbody>
      </table>
      <p className="mt-2 flex flex-wrap gap-2">
        <Button
          look="primary"
          onClick={() =>
            onResolve({
              ...theirs,
              ...Object.fromEntries(
                fields.map((field) => [field, keepsMine(field) ? mine[field] : theirs[field]]),
              ),
            })
          }
        >
          Use what is chosen
        </Button>
        <Button onClick={() => onResolve(mine)}>Keep all of mine</Button>
        <Button onClick={() => onResolve(theirs)}>Take all of theirs</Button>
      </p>
    </Notice>
  )
}

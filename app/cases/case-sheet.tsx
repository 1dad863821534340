import { type KeyboardEvent, type ReactNode, useEffect, useId, useRef, useState } from 'react'
import type { Case } from './case'
import type { LineInput, SheetLine } from './sheet-lines'

/** A case as the sheet shows it: drafts and all. */
export interface SheetCase {
  id: string
  body: Case
  /** What the rules of a case refuse, by field. */
  problems: readonly { field: string; message: string }[]
  state: 'saved' | 'unsaved' | 'conflict'
}

/**
 * The case sheet: one column a case, one line a quantity. A blank cell inherits from the base case; what a case says
 * itself is bold and marked. Enter and the arrow keys move along a column, Escape takes back what was typed.
 */
export function CaseSheet({
  cases,
  lines,
  editable,
  onSet,
  head,
  foot,
}: {
  cases: readonly SheetCase[]
  lines: readonly SheetLine[]
  editable: boolean
  onSet: (id: string, values: Partial<Case>) => void
  /** More in the head of a case's column. */
  head?: (one: SheetCase) => ReactNode
  /** Last lines of the sheet: a label, and what stands in the column of each case. */
  foot?: readonly { label: string; cell: (one: SheetCase) => ReactNode }[]
}) {
  const table = useRef<HTMLTableElement>(null)
  const groups = [...new Set(lines.map((line) => line.group))]

  function move(from: HTMLElement, event: KeyboardEvent) {
    const step = event.key === 'ArrowUp' ? -1 : event.key === 'ArrowDown' || event.key === 'Enter' ? 1 : 0
    if (step === 0) return
    const column = from.dataset.case
    const cells = [...(table.current?.querySelectorAll<HTMLElement>(`[data-case="${column}"]`) ?? [])]
    const next = cells[cells.indexOf(from) + step]
    if (!next) return
    event.preventDefault()
    next.focus()
  }

  return (
    // biome-ignore lint/a11y/noNoninteractiveTabindex: a region that scrolls must be reachable by keyboard
    <section className="overflow-x-auto border border-rule" tabIndex={0} aria-label="Case sheet">
      <table ref={table} className="w-full border-collapse text-[0.93rem]">
        <caption className="sr-only">
          Case sheet: one column a case, one line a quantity; a blank cell inherits from the base case
        </caption>
        <thead>
          <tr className="border-b border-flint-2 align-bottom">
            <th
              scope="col"
              className="sticky left-0 z-10 min-w-36 bg-chalk-2 px-2.5 py-1.5 text-left font-semibold"
            >
              Quantity
            </th>
            {cases.map((one) => (
              <th
                key={one.id}
                scope="col"
                className="min-w-34 border-l border-rule bg-chalk-2 px-1 py-1.5 text-right font-semibold"
              >
                <span className="block px-1.5 text-[0.82em] font-normal text-flint-2">
                  {one.body.isBase ? 'base case' : 'case'}
                  {one.state !== 'saved' && ' · not saved yet'}
                </span>
                {editable ? (
                  <Cell
                    label={`Name of ${one.body.name}`}
                    column={one.id}
                    value={one.body.name}
                    faint=""
                    strong
                    problem={messageFor(one, 'name')}
                    onMove={move}
                    onCommit={(text) =>
                      text.trim() === ''
                        ? { ok: false, message: 'Name the case.' }
                        : { ok: true, set: { name: text.trim() } }
                    }
                    onSet={(set) => onSet(one.id, set)}
                  />
                ) : (
                  <span className="px-1.5">{one.body.name}</span>
                )}
                {head?.(one)}
              </th>
            ))}
          </tr>
        </thead>
        {groups.map((group) => (
          <tbody key={group}>
            <tr className="border-b border-rule">
              <th
                scope="colgroup"
                colSpan={cases.length + 1}
                className="sticky left-0 bg-chalk px-2.5 pt-3 pb-1 text-left text-[0.87rem] font-semibold text-flint-2"
              >
                {group}
              </th>
            </tr>
            {lines
              .filter((line) => line.group === group)
              .map((line) => (
                <tr key={line.key} className="border-b border-rule">
                  <th scope="row" className="sticky left-0 z-10 bg-chalk px-2.5 py-1 text-left font-normal">
                    {line.label}
                    {line.unit && <span className="ml-1.5 text-[0.87em] text-flint-2">{line.unit}</span>}
                    {line.note && (
                      <span className="block text-[0.82em] leading-tight text-flint-2">{line.note}</span>
                    )}
                  </th>
                  {cases.map((one) => (
                    <td
                      key={one.id}
                      className={`border-l p-0 text-right align-middle ${
                        isMarked(line, one)
                          ? 'border-l-[3px] border-l-bourne bg-bourne-2/60 font-semibold'
                          : 'border-rule'
                      }`}
                    >
                      <LineCell
                        line={line}
                        one={one}
                        editable={editable}
                        onMove={move}
                        onSet={(set) => onSet(one.id, set)}
                      />
                    </td>
                  ))}
                </tr>
              ))}
          </tbody>
        ))}
        {foot && (
          <tfoot>
            {foot.map((line) => (
              <tr key={line.label} className="border-t border-flint-2 bg-chalk-2 align-top">
                <th
                  scope="row"
                  className="sticky left-0 z-10 bg-chalk-2 px-2.5 py-1.5 text-left font-semibold"
                >
                  {line.label}
                </th>
                {cases.map((one) => (
                  <td key={one.id} className="border-l border-rule px-2.5 py-1.5 text-right">
                    {line.cell(one)}
                  </td>
                ))}
              </tr>
            ))}
          </tfoot>
        )}
      </table>
    </section>
  )
}

/** A case other than the base case says this itself. */
function isMarked(line: SheetLine, one: SheetCase): boolean {
  return !line.computed && !line.words && !one.body.isBase && line.own(one.body) !== ''
}

function messageFor(one: SheetCase, field: string): string | undefined {
  return one.problems.find((problem) => problem.field.split('.')[0] === field)?.message
}

/** The field of a case that a line writes to. */
function fieldOf(line: SheetLine): string {
  if (['xMin', 'xMax', 'yMin', 'yMax'].includes(line.key)) return 'extent'
  return line.key.includes(' ') ? 'overrides' : line.key
}

function LineCell({
  line,
  one,
  editable,
  onMove,
  onSet,
}: {
  line: SheetLine
  one: SheetCase
  editable: boolean
  onMove: (from: HTMLElement, event: KeyboardEvent) => void
  onSet: (values: Partial<Case>) => void
}) {
  const own = line.own(one.body)
  const faint = line.inherited(one.body)
  if (line.computed) return <span className="block px-2.5 py-1 whitespace-nowrap">{own || '–'}</span>
  if (!editable || (one.body.isBase && line.baseFrom)) {
    return (
      <span className="block px-2.5 py-1 whitespace-nowrap">
        {own || (one.body.isBase ? faint : <Inherited text={faint} />) || '–'}
      </span>
    )
  }
  const problem = line.baseFrom ? undefined : messageFor(one, fieldOf(line))
  const label = `${line.label}, ${one.body.name}`
  if (line.choices) {
    return (
      <select
        aria-label={label}
        aria-invalid={problem ? true : undefined}
        data-case={one.id}
        className={`w-full cursor-pointer bg-transparent px-2 py-1 text-right ${own ? '' : 'text-flint-2'}`}
        value={own}
        onChange={(event) => {
          const read = line.read(one.body, event.target.value)
          if (read.ok) onSet(read.set)
        }}
      >
        {(!one.body.isBase || own === '') && <option value="">{faint || 'choose'}</option>}
        {line.choices.map((choice) => (
          <option key={choice} value={choice}>
            {choice}
          </option>
        ))}
      </select>
    )
  }
  return (
    <Cell
      label={label}
      column={one.id}
      value={own}
      faint={faint}
      problem={problem}
      onMove={onMove}
      onCommit={(text) => line.read(one.body, text)}
      onSet={onSet}
    />
  )
}

function Inherited({ text }: { text: string }) {
  return text ? <span className="text-flint-2">{text}</span> : null
}

/** One cell: keeps what was typed, with the reason, until it can be read. */
function Cell({
  label,
  column,
  value,
  faint,
  strong = false,
  problem,
  onMove,
  onCommit,
  onSet,
}: {
  label: string
  column: string
  value: string
  faint: string
  strong?: boolean
  problem?: string
  onMove: (from: HTMLElement, event: KeyboardEvent) => void
  onCommit: (text: string) => LineInput
  onSet: (values: Partial<Case>) => void
}) {
  const [typed, setTyped] = useState<string | null>(null)
  const [refused, setRefused] = useState<string | null>(null)
  const messageId = useId()

  // A value that came from elsewhere (an undo, somebody else's save) takes the place of text that was refused.
  // biome-ignore lint/correctness/useExhaustiveDependencies: only a new value clears the cell
  useEffect(() => {
    setTyped(null)
    setRefused(null)
  }, [value])

  /** False when the text stays in the cell because it could not be read. */
  function commit(): boolean {
    const read = typed === null || typed === value ? null : onCommit(typed)
    if (read && !read.ok) {
      setRefused(read.message)
      return false
    }
    setTyped(null)
    setRefused(null)
    if (read) onSet(read.set)
    return true
  }

  const message = refused ?? problem
  return (
    <span className="block">
      <input
        aria-label={label}
        aria-invalid={message ? true : undefined}
        aria-describedby={message ? messageId : undefined}
        data-case={column}
        className={`w-full min-w-24 bg-transparent px-2 py-1 text-right placeholder:text-flint-2 placeholder:opacity-100 aria-invalid:bg-madder-2 ${strong ? 'font-semibold' : ''}`}
        value={typed ?? value}
        placeholder={faint}
        onChange={(event) => setTyped(event.target.value)}
        onFocus={(event) => event.target.select()}
        onBlur={commit}
        onKeyDown={(event) => {
          if (event.key === 'Escape') {
            setTyped(null)
            setRefused(null)
          } else if (event.key !== 'Enter' || commit()) {
            onMove(event.currentTarget, event)
          }
        }}
      />
      {message && (
        <span
          id={messageId}
          className="block w-0 min-w-full px-2 pb-1 text-right text-[0.82rem] leading-tight font-semibold whitespace-normal text-madder"
        >
          {message}
        </span>
      )}
    </span>
  )
}

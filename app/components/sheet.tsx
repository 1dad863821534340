import { lazy, type ReactNode, Suspense, useEffect, useRef, useState } from 'react'
import type { ProjectUnits } from '~/units'
import { Button } from './button'
import { Notice } from './notice'
import { type CellInput, cellText, headerUnit, readCell, type SheetColumn } from './sheet-cells'
import { SheetTable } from './sheet-table'
import { readBlock, writeBlock } from './sheet-text'
import { safeCell } from './spreadsheet'

/**
 * A sheet: rows of one kind, as on a calculation pad. Edited like a spreadsheet (type, paste a block, undo, sort),
 * printed and served without scripts as a plain table.
 *
 *   const book = useRows(rows, { projectId, userId: member.userId, schemas: waterSchemas })   // ~/book/use-rows
 *   <Sheet
 *     label="Wells" noun="well" units={project.units}
 *     columns={wellColumns}                 // SheetColumn[]: field, label, editor, dimension …, see sheet-cells.ts
 *     {...book.sheet('well')}               // rows, and the edits that make it editable
 *     newRow={() => ({ name: 'W9', kind: 'abstraction' })}
 *   />
 *
 * Without `edits` the same sheet is for reading only (a role that may only look, a sheet of results):
 *   <Sheet label="Heads" noun="point" units={units} columns={columns} rows={rows.map((r) => ({ id: r.name, body: r }))} />
 */
export interface SheetProps {
  /** What the sheet holds, in the plural: "Wells". Names it for a screen reader too. */
  label: string
  /** One row in words: "well", for "Add well" and "Delete 2 wells". */
  noun: string
  /** Its plural where an s is not enough. */
  nouns?: string
  units: ProjectUnits
  columns: readonly SheetColumn[]
  rows: readonly SheetRow[]
  /** Makes the sheet editable. */
  edits?: SheetEdits
  /** Body of a row that somebody adds: defaults, perhaps the next name. */
  newRow?: () => Record<string, unknown>
  /** Words about an empty sheet. */
  empty?: string
  /** Remarks that refuse nothing (a value outside common practice), by row id. */
  warnings?: Readonly<Record<string, readonly SheetNote[]>>
  /** Where else a row is used; deleting such a row asks first, or says why it must stay. */
  usedBy?: (id: string) => readonly SheetUse[]
  /** Row chosen here or in the drawing; the other follows. */
  selectedId?: string | null
  onSelect?: (id: string | null) => void
  /** Row pointed at here or in the drawing. */
  hoveredId?: string | null
  onHover?: (id: string | null) => void
  /** More buttons for the line above the sheet. */
  tools?: ReactNode
  /** Rows shown before the sheet scrolls. Default 14. */
  tall?: number
}

export interface SheetNote {
  /** Field of the cell; '' for the row as a whole. */
  field: string
  message: string
}

export interface SheetUse {
  /** "case C2" */
  words: string
  /** The other row cannot do without this one. */
  holds: boolean
}

export interface SheetRow {
  id: string
  body: Record<string, unknown>
  /** Cells whose text could not be read: the text is kept here, with the reason. */
  typed?: Readonly<Record<string, { text: string; message: string }>>
  /** What the row's own rules refuse. A field may go deeper: "line.3.0" marks the cell "line". */
  problems?: readonly SheetNote[]
  /** Not saved yet, or waiting for somebody to choose between two values. */
  state?: 'saved' | 'unsaved' | 'conflict'
}

/** One edit; the edits of one gesture (a paste, a deletion) go together, and are undone together. */
export type SheetEdit =
  | { op: 'set'; id: string; cells: Record<string, CellInput> }
  | { op: 'add'; id: string; body: Record<string, unknown>; cells: Record<string, CellInput> }
  | { op: 'delete'; id: string; alsoElsewhere?: boolean }

export interface SheetEdits {
  apply: (edits: SheetEdit[]) => void
  undo: () => void
  redo: () => void
  canUndo: boolean
  canRedo: boolean
}

// The grid is a large package and draws in the browser only: the plain table stands in until it has arrived.
const SheetGrid = lazy(() => import('./sheet-grid').then((module) => ({ default: module.SheetGrid })))

export function Sheet(props: SheetProps) {
  const { label, noun, nouns = `${noun}s`, columns, rows, edits, units, usedBy } = props
  const [mounted, setMounted] = useState(false)
  const [picked, setPicked] = useState<readonly string[]>([])
  const [asking, setAsking] = useState<readonly string[]>([])
  const [copied, setCopied] = useState('')
  const [focusId, setFocusId] = useState<string | null>(null)
  const frame = useRef<HTMLElement>(null)
  const focused = useRef<{ rowId: string; field: string } | null>(null)
  const order = useRef<readonly string[]>([])

  useEffect(() => setMounted(true), [])

  const present = picked.filter((id) => rows.some((row) => row.id === id))
  const orderedRows = () => {
    const known = new Map(rows.map((row) => [row.id, row]))
    const shown = order.current.flatMap((id) => known.get(id) ?? [])
    return shown.length === rows.length ? shown : rows
  }

  function add() {
    const id = crypto.randomUUID()
    edits?.apply([{ op: 'add', id, body: props.newRow?.() ?? {}, cells: {} }])
    setFocusId(id)
  }

  function remove(ids: readonly string[], sure = false) {
    if (!edits || ids.length === 0) return
    if (!sure && ids.some((id) => (usedBy?.(id).length ?? 0) > 0)) {
      setAsking(ids)
      return
    }
    edits.apply(ids.map((id) => ({ op: 'delete', id, alsoElsewhere: sure })))
    setAsking([])
    setPicked([])
    frame.current?.focus()
  }

  function blockOf(ids: readonly string[]): string {
    const chosen = orderedRows().filter((row) => ids.length === 0 || ids.includes(row.id))
    const head = columns.map((column) => {
      const unit = headerUnit(column, units)
      return unit ? `${column.label} (${unit})` : column.label
    })
    const cells = chosen.map((row) => columns.map((column) => copyText(column, row, units)))
    return writeBlock([head, ...cells])
  }

  async function copy() {
    try {
      await navigator.clipboard.writeText(blockOf(present))
      const count = present.length || rows.length
      setCopied(`${count} ${count === 1 ? noun : nouns} copied.`)
    } catch {
      // The browser may refuse the clipboard outside a secure page; Ctrl+C in the sheet needs no such leave.
      setCopied('The browser did not allow it: choose rows and press Ctrl+C instead.')
    }
  }

  function paste(text: string) {
    if (!edits) return
    const plan = planPaste({
      block: readBlock(text),
      columns,
      rows: orderedRows(),
      at: focused.current,
      units,
      newId: () => crypto.randomUUID(),
      newRow: props.newRow ?? (() => ({})),
    })
    if (plan.length > 0) edits.apply(plan)
  }

  const notes = noteList(props)
  const uses = asking.flatMap((id) => usedBy?.(id) ?? [])
  const held = uses.some((use) => use.holds)

  return (
    <section
      ref={frame}
      aria-label={label}
      tabIndex={-1}
      className="sheet mb-4 outline-none"
      onPaste={(event) => {
        if (!edits || isTyping(event.target)) return
        event.preventDefault()
        paste(event.clipboardData.getData('text/plain'))
      }}
      onCopy={(event) => {
        if (isTyping(event.target) || !window.getSelection()?.isCollapsed) return
        const cell = focused.current
        const row = cell && rows.find((one) => one.id === cell.rowId)
        const column = cell && columns.find((one) => one.field === cell.field)
        if (present.length === 0 && !(row && column)) return
        event.preventDefault()
        event.clipboardData.setData(
          'text/plain',
          present.length > 0 || !row || !column ? blockOf(present) : copyText(column, row, units),
        )
      }}
      onKeyDown={(event) => {
        if (!edits || isTyping(event.target) || !(event.ctrlKey || event.metaKey)) return
        const key = event.key.toLowerCase()
        if (key === 'z' && !event.shiftKey) edits.undo()
        else if (key === 'y' || (key === 'z' && event.shiftKey)) edits.redo()
        else return
        event.preventDefault()
      }}
    >
      <div className="screen-only mb-1.5 flex flex-wrap items-center gap-1.5">
        {edits && (
          <>
            <Button look="quiet" onClick={add} disabled={!mounted}>
              Add {noun}
            </Button>
            <Button look="quiet" onClick={() => remove(present)} disabled={present.length === 0}>
              {present.length > 1 ? `Delete ${present.length} ${nouns}` : 'Delete'}
            </Button>
            <Button look="quiet" onClick={edits.undo} disabled={!edits.canUndo} title="Ctrl+Z">
              Undo
            </Button>
            <Button look="quiet" onClick={edits.redo} disabled={!edits.canRedo} title="Ctrl+Y">
              Redo
            </Button>
          </>
        )}
        {rows.length > 0 && (
          <Button look="quiet" onClick={copy} disabled={!mounted}>
            {present.length > 0 ? `Copy ${present.length}` : 'Copy sheet'}
          </Button>
        )}
        {props.tools}
        <span role="status" className="text-[0.87rem] text-flint-2">
          {copied}
        </span>
      </div>
      {asking.length > 0 && (
        <Notice
          tone="warn"
          live
          title={
            held
              ? `${asking.length === 1 ? `This ${noun} is` : 'Some of these are'} needed elsewhere and must stay:`
              : `Delete ${asking.length === 1 ? `this ${noun}` : `these ${nouns}`} there too?`
          }
        >
          <ul className="my-1 list-disc pl-5">
            {uses.map((use) => (
              <li key={use.words}>{use.words}</li>
            ))}
          </ul>
          <p className="mt-2 flex gap-2">
            {!held && (
              <Button look="danger" onClick={() => remove(asking, true)}>
                Delete there too
              </Button>
            )}
            <Button onClick={() => setAsking([])}>{held ? 'Close' : 'Keep'}</Button>
          </p>
        </Notice>
      )}
      <div className="print:hidden">
        {mounted ? (
          <Suspense fallback={<SheetTable {...props} />}>
            <SheetGrid
              {...props}
              focusId={focusId}
              onFocused={() => setFocusId(null)}
              onPick={setPicked}
              onDelete={(ids) => remove(ids)}
              focused={focused}
              order={order}
            />
          </Suspense>
        ) : (
          <SheetTable {...props} />
        )}
      </div>
      {mounted && (
        <div className="hidden print:block">
          <SheetTable {...props} />
        </div>
      )}
      {notes.length > 0 && (
        <ul className="mt-1.5 text-[0.87rem]" aria-label={`${label}: remarks`}>
          {notes.slice(0, 12).map((note) => (
            <li key={`${note.row}${note.column}${note.message}`} className="flex gap-1.5">
              <span aria-hidden className={note.wrong ? 'text-madder' : 'text-ochre'}>
                {note.wrong ? '◆' : '▲'}
              </span>
              <span>
                <b className="font-semibold">{[note.row, note.column].filter(Boolean).join(', ')}:</b>{' '}
                {note.message}
                {!note.wrong && <span className="text-flint-2"> (to consider; saved all the same)</span>}
              </span>
            </li>
          ))}
          {notes.length > 12 && <li className="text-flint-2">and {notes.length - 12} more.</li>}
        </ul>
      )}
    </section>
  )
}

function isTyping(target: EventTarget): boolean {
  return (
    target instanceof HTMLElement && target.closest('input, textarea, select, [contenteditable]') !== null
  )
}

function copyText(column: SheetColumn, row: SheetRow, units: ProjectUnits): string {
  const typed = row.typed?.[column.field]
  const text = column.reads
    ? column.reads(row.body)
    : (typed?.text ?? cellText(column, row.body[column.field], units))
  return column.editor === 'text' || column.editor === 'choice' || typed || column.reads
    ? safeCell(text)
    : text
}

interface NoteLine {
  row: string
  column: string
  message: string
  wrong: boolean
}

/** Everything that is wrong, then everything to consider, in words that name row and column. */
function noteList({ rows, columns, noun, warnings }: SheetProps): NoteLine[] {
  const wrong: NoteLine[] = []
  const consider: NoteLine[] = []
  rows.forEach((row, index) => {
    const name = String(row.body[columns[0]?.field ?? ''] || `${noun} in line ${index + 1}`)
    const titled = (field: string) => {
      const column = columns.find((one) => one.field === field.split('.')[0])
      return column ? column.label : ''
    }
    for (const [field, { message }] of Object.entries(row.typed ?? {})) {
      wrong.push({ row: name, column: titled(field), message, wrong: true })
    }
    for (const { field, message } of row.problems ?? []) {
      wrong.push({ row: name, column: titled(field), message, wrong: true })
    }
    for (const { field, message } of warnings?.[row.id] ?? []) {
      consider.push({ row: name, column: titled(field), message, wrong: false })
    }
  })
  return [...wrong, ...consider]
}

interface PastePlan {
  block: string[][]
  columns: readonly SheetColumn[]
  /** Rows in the order on the page. */
  rows: readonly SheetRow[]
  /** Cell that has the focus; nothing: the block is added below. */
  at: { rowId: string; field: string } | null
  units: ProjectUnits
  newId: () => string
  newRow: () => Record<string, unknown>
}

/**
 * Turns a pasted block into edits: cells from the focused one to the right and down, lines beyond the last row as
 * new rows. A first line that repeats the column headings is taken as headings. Columns for reading only are passed
 * over, so that a copied sheet fits where it came from.
 */
export function planPaste({ block, columns, rows, at, units, newId, newRow }: PastePlan): SheetEdit[] {
  const startColumn = Math.max(0, at ? columns.findIndex((column) => column.field === at.field) : 0)
  const targets = columns.slice(startColumn)
  const lines = isHeading(block[0], targets) ? block.slice(1) : block
  const startRow = at ? rows.findIndex((row) => row.id === at.rowId) : -1
  const edits: SheetEdit[] = []
  lines.forEach((line, index) => {
    if (line.every((cell) => cell.trim() === '')) return
    const row = startRow < 0 ? undefined : rows[startRow + index]
    const cells: Record<string, CellInput> = {}
    const body = row?.body ?? newRow()
    line.forEach((text, offset) => {
      const column = targets[offset]
      if (!column || column.reads) return
      cells[column.field] = readCell(column, text, units)
    })
    // What a cell means can depend on another of the same line: a flux counts only beside its kind.
    const chosen = { ...body }
    for (const [field, input] of Object.entries(cells)) if (input.ok) chosen[field] = input.value
    for (const column of columns) {
      if (column.applies && !column.applies(chosen)) delete cells[column.field]
    }
    if (row) edits.push({ op: 'set', id: row.id, cells })
    else edits.push({ op: 'add', id: newId(), body, cells })
  })
  return edits
}

function isHeading(line: string[] | undefined, columns: readonly SheetColumn[]): boolean {
  if (!line) return false
  const plain = (text: string) =>
    text
      .replace(/\(.*\)/, '')
      .trim()
      .toLowerCase()
  return line.every((cell, index) => {
    const column = columns[index]
    return column !== undefined && plain(cell) === plain(column.label)
  })
}

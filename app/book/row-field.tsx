import { TextField } from '~/components/field'
import type { RowsEditor } from './use-rows'

interface RowFieldProps {
  book: RowsEditor
  kind: string
  /** Id of the one row that the form is. */
  id: string
  field: string
  label: string
  hint?: string
  rows?: number
}

/** One paragraph of a section that is a form; it is saved by itself, like a cell of a sheet. */
export function RowField({ book, kind, id, field, label, hint, rows = 2 }: RowFieldProps) {
  const row = book.rows(kind).find((one) => one.id === id)
  const value = String(row?.body[field] ?? '')
  const errors = row?.problems.filter((problem) => problem.field === field).map((problem) => problem.message)

  function change(text: string) {
    const cells = { [field]: { ok: true as const, value: text } }
    book.apply([row ? { op: 'set', id, cells, typing: true } : { op: 'add', id, kind, body: {}, cells }])
  }

  if (!book.editable) return <Printed label={label} value={value} />
  return (
    <>
      <div className="print:hidden">
        <TextField
          label={label}
          hint={hint}
          errors={errors}
          rows={rows}
          value={value}
          style={{ fieldSizing: 'content', minHeight: `${rows * 1.45 + 0.8}em` }}
          onChange={(event) => change(event.target.value)}
        />
      </div>
      <div className="hidden print:block">
        <Printed label={label} value={value} />
      </div>
    </>
  )
}

function Printed({ label, value }: { label: string; value: string }) {
  return (
    <div>
      <h3 className="text-sm font-semibold text-flint-2">{label}</h3>
      <p className="whitespace-pre-line">{value || '–'}</p>
    </div>
  )
}

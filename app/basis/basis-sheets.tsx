import { nextName } from '~/book/next-name'
import type { RowsEditor } from '~/book/use-rows'
import { Sheet } from '~/components/sheet'
import type { SheetColumn } from '~/components/sheet-cells'
import type { ProjectUnits } from '~/units'
import { assumptionSchema, basisSchema, standardSchema, standardStatuses } from './basis'

export const basisSchemas = { basis: basisSchema, assumption: assumptionSchema, standard: standardSchema }

/** The form of section 1 is a single row, whose id is its kind: two people who start it meet in the same row. */
export const basisRowId = 'basis'

const assumptionColumns: SheetColumn[] = [
  { field: 'reference', label: 'Ref.', editor: 'text', width: 72 },
  { field: 'statement', label: 'Assumption', editor: 'text', long: true, width: 220 },
  { field: 'why', label: 'Why', editor: 'text', long: true },
  { field: 'effect', label: 'Effect if wrong', editor: 'text', long: true },
  { field: 'source', label: 'Source', editor: 'text', long: true, width: 140 },
]

const standardColumns: SheetColumn[] = [
  { field: 'title', label: 'Standard or guide', editor: 'text', width: 260 },
  { field: 'edition', label: 'Edition', editor: 'text', width: 150 },
  {
    field: 'status',
    label: 'Status',
    editor: 'choice',
    choices: standardStatuses.map((status) => ({ value: status, label: status })),
    note: 'As far as the maker of this calculation knows; it is not looked up.',
  },
  { field: 'use', label: 'Used for', editor: 'text', long: true },
]

const formColumns: SheetColumn[] = [
  { field: 'question', label: 'Question', editor: 'text' },
  { field: 'accuracy', label: 'Required accuracy', editor: 'text' },
  { field: 'intendedUse', label: 'Intended use', editor: 'text' },
  { field: 'notFor', label: 'Not for', editor: 'text' },
  { field: 'idealisation', label: 'Idealisation', editor: 'text' },
  { field: 'conclusions', label: 'Conclusions', editor: 'text' },
]

/** Columns of every kind of row of section 1, for the names of its fields. */
export const basisColumns = { basis: formColumns, assumption: assumptionColumns, standard: standardColumns }

interface BasisSheetProps {
  book: RowsEditor
  units: ProjectUnits
}

export function AssumptionSheet({ book, units }: BasisSheetProps) {
  const { rows, edits } = book.sheet('assumption')
  return (
    <Sheet
      label="Assumptions"
      noun="assumption"
      units={units}
      columns={assumptionColumns}
      rows={rows}
      edits={edits}
      newRow={() => ({
        reference: nextName(
          rows.map((row) => String(row.body.reference ?? '')),
          'A',
        ),
      })}
      empty="No assumption is registered yet."
    />
  )
}

export function StandardSheet({ book, units }: BasisSheetProps) {
  return (
    <Sheet
      label="Standards and guides"
      noun="standard"
      units={units}
      columns={standardColumns}
      {...book.sheet('standard')}
      newRow={() => ({ status: 'not known' })}
      empty="No standard or guide is named yet."
    />
  )
}

import type { RowsEditor } from '~/book/use-rows'
import { Sheet } from '~/components/sheet'
import type { SheetColumn } from '~/components/sheet-cells'
import { formatNumber, type ProjectUnits } from '~/units'
import { estimateSchema } from './estimate'

export const checkSchemas = { estimate: estimateSchema }

const estimateColumns: SheetColumn[] = [
  { field: 'result', label: 'Result', editor: 'text', width: 150 },
  { field: 'method', label: 'Formula or method', editor: 'text', long: true, width: 200 },
  { field: 'working', label: 'Working', editor: 'text', long: true, width: 220 },
  { field: 'value', label: 'Estimate', editor: 'number', width: 100 },
  { field: 'unit', label: 'Unit', editor: 'text', width: 76 },
  {
    field: 'computed',
    label: 'Computed',
    editor: 'number',
    blank: 'not entered',
    width: 110,
    note: 'The figure of the run that the estimate stands beside.',
  },
  {
    field: 'ratio',
    label: 'Computed / estimate',
    editor: 'text',
    width: 120,
    reads: (body) => {
      const { computed, value } = body as { computed?: number | null; value?: number }
      return typeof computed === 'number' && typeof value === 'number' && value !== 0
        ? formatNumber(computed / value, 2)
        : '–'
    },
  },
  { field: 'source', label: 'Source', editor: 'text', long: true, width: 140 },
]

export const checkColumns = { estimate: estimateColumns }

export function EstimateSheet({ book, units }: { book: RowsEditor; units: ProjectUnits }) {
  return (
    <Sheet
      label="Independent estimates"
      noun="estimate"
      units={units}
      columns={estimateColumns}
      {...book.sheet('estimate')}
      newRow={() => ({})}
      empty="No independent estimate has been made yet."
    />
  )
}

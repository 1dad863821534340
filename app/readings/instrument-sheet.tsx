import { useMemo } from 'react'
import { placeSchemas } from '~/book/field'
import { nextName } from '~/book/next-name'
import type { RowsEditor } from '~/book/use-rows'
import { Sheet, type SheetProps, type SheetUse } from '~/components/sheet'
import type { SheetColumn } from '~/components/sheet-cells'
import type { DrawnFeature } from '~/ground/drawing/drawn-feature'
import type { ProjectUnits } from '~/units'
import { type Instrument, instrumentKinds, instrumentSchema } from './instrument'

export const readingSchemas = { instrument: instrumentSchema }

/** Columns of the sheet of instruments; `points` are the named points of section 2. */
export function instrumentColumns(
  units: ProjectUnits,
  points: readonly { id: string; name: string }[],
): SheetColumn[] {
  return [
    { field: 'name', label: 'Instrument', editor: 'text', width: 120 },
    {
      field: 'kind',
      label: 'Kind',
      editor: 'choice',
      choices: instrumentKinds.map((kind) => ({ value: kind, label: kind })),
      width: 170,
      note: 'Vibrating-wire: readings already converted to a level or a pressure head.',
    },
    { field: 'x', label: 'x', editor: 'number', unitText: units.length, width: 100 },
    { field: 'y', label: 'y', editor: 'number', unitText: units.length, width: 100 },
    {
      field: 'groundLevel',
      label: 'Ground level',
      editor: 'quantity',
      dimension: 'length',
      blank: 'not levelled',
    },
    {
      field: 'responseTop',
      label: 'Response zone top',
      editor: 'quantity',
      dimension: 'length',
      blank: 'not known',
      width: 150,
      note: 'Level of the top of the response zone.',
    },
    {
      field: 'responseBase',
      label: 'Response zone base',
      editor: 'quantity',
      dimension: 'length',
      blank: 'not known',
      width: 150,
    },
    { field: 'serial', label: 'Serial', editor: 'text', width: 100 },
    {
      field: 'installedOn',
      label: 'Installed on',
      editor: 'text',
      blank: 'not known',
      width: 120,
      note: 'A date such as 2026-03-14. Readings before it are refused.',
    },
    {
      field: 'pointId',
      label: 'Named point',
      editor: 'choice',
      choices: points.map(({ id, name }) => ({ value: id, label: name })),
      blank: 'its own position',
      width: 130,
      note: 'The point of section 2 whose modelled head it is compared with.',
    },
    { field: 'outOfService', label: 'Out of service', editor: 'checkbox', width: 120 },
    { field: 'source', label: 'Source', editor: 'text', width: 220 },
  ]
}

/** What an instrument starts with, whether it comes from the sheet or from the drawing. */
export function newInstrument(book: RowsEditor): Record<string, unknown> {
  const names = book.rows('instrument').map((row) => String(row.body.name ?? ''))
  return { name: nextName(names, 'P'), kind: 'standpipe', outOfService: false }
}

/** Instruments for the drawing, as soon as they have a place. */
export function instrumentFeatures(book: RowsEditor): DrawnFeature[] {
  return book.placed<Instrument>('instrument', placeSchemas.point).map(({ id, body }) => ({
    id,
    kind: 'instrument',
    label: body.name,
    geometry: { type: 'point', at: [body.x, body.y] },
  }))
}

export function InstrumentSheet({
  book,
  units,
  points,
  uses,
  ...shared
}: {
  book: RowsEditor
  units: ProjectUnits
  points: readonly { id: string; name: string }[]
  uses: Readonly<Record<string, readonly SheetUse[]>>
} & Pick<SheetProps, 'selectedId' | 'onSelect' | 'hoveredId' | 'onHover'>) {
  const columns = useMemo(() => instrumentColumns(units, points), [units, points])
  return (
    <Sheet
      label="Instruments"
      noun="instrument"
      units={units}
      columns={columns}
      {...book.sheet('instrument')}
      newRow={() => newInstrument(book)}
      usedBy={(id) => uses[id] ?? []}
      empty="No instrument yet. Add one, paste a block from a spreadsheet, or let a survey file bring them."
      tall={10}
      {...shared}
    />
  )
}

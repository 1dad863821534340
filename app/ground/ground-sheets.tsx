import { useMemo } from 'react'
import { nextName } from '~/book/next-name'
import type { RowsEditor } from '~/book/use-rows'
import { Sheet, type SheetProps, type SheetUse } from '~/components/sheet'
import type { SheetColumn } from '~/components/sheet-cells'
import type { ProjectUnits } from '~/units'
import {
  type Material,
  materialSchema,
  type Point,
  planImageSchema,
  pointSchema,
  type Zone,
  zoneSchema,
} from './ground'
import { materialRemarks, pointRemarks, zoneRemarks } from './ground-remarks'

export const groundSchemas = {
  material: materialSchema,
  zone: zoneSchema,
  point: pointSchema,
  'plan image': planImageSchema,
}

/** What the sheets of a section share: the row that is chosen or pointed at, and where rows are used elsewhere. */
export type SharedWithDrawing = Pick<SheetProps, 'selectedId' | 'onSelect' | 'hoveredId' | 'onHover'>

interface GroundSheetProps {
  book: RowsEditor
  units: ProjectUnits
  shared: SharedWithDrawing
  /** Uses by rows of other sections, by the id of the used row. */
  uses: Readonly<Record<string, readonly SheetUse[]>>
}

const materialColumns: SheetColumn[] = [
  { field: 'name', label: 'Material', editor: 'text', width: 150 },
  {
    field: 'kx',
    label: 'K along x',
    editor: 'quantity',
    dimension: 'conductivity',
    note: 'Hydraulic conductivity K (permeability k) along the x axis of the grid.',
  },
  { field: 'ky', label: 'K along y', editor: 'quantity', dimension: 'conductivity' },
  {
    field: 'kLow',
    label: 'K low',
    editor: 'quantity',
    dimension: 'conductivity',
    blank: 'not given',
    note: 'Low end of the range that the source allows.',
  },
  { field: 'kHigh', label: 'K high', editor: 'quantity', dimension: 'conductivity', blank: 'not given' },
  {
    field: 'specificStorage',
    label: 'Specific storage',
    editor: 'quantity',
    dimension: 'per length',
    blank: 'not given',
    width: 140,
  },
  { field: 'specificYield', label: 'Specific yield', editor: 'number', unitText: '–', blank: 'not given' },
  { field: 'porosity', label: 'Porosity', editor: 'number', unitText: '–', blank: 'not given', width: 100 },
  { field: 'source', label: 'Source', editor: 'text', width: 220 },
]

function zoneColumns(
  length: ProjectUnits['length'],
  materials: readonly { id: string; name: string }[],
): SheetColumn[] {
  return [
    { field: 'name', label: 'Zone', editor: 'text', width: 150 },
    {
      field: 'materialId',
      label: 'Material',
      editor: 'choice',
      choices: materials.map(({ id, name }) => ({ value: id, label: name })),
      width: 150,
    },
    { field: 'base', label: 'Base level', editor: 'quantity', dimension: 'length' },
    {
      field: 'top',
      label: 'Top level',
      editor: 'quantity',
      dimension: 'length',
      blank: 'open above',
      note: 'Needed for confined flow: the underside of the layer above.',
    },
    {
      field: 'polygon',
      label: 'Outline x y; x y; …',
      editor: 'vertices',
      unitText: length,
      blank: 'everywhere',
      note: 'Blank: everywhere. A zone further down replaces those above it where they overlap.',
    },
    { field: 'source', label: 'Source', editor: 'text', width: 220 },
  ]
}

function pointColumns(length: ProjectUnits['length']): SheetColumn[] {
  return [
    { field: 'name', label: 'Point', editor: 'text' },
    { field: 'x', label: 'x', editor: 'number', unitText: length },
    { field: 'y', label: 'y', editor: 'number', unitText: length },
    { field: 'source', label: 'Source', editor: 'text' },
  ]
}

function materialNames(book: RowsEditor): { id: string; name: string }[] {
  return book.rows('material').map((row) => ({ id: row.id, name: String(row.body.name ?? '') }))
}

/** What a new row starts with, whether it comes from a sheet or from the drawing. */
export function newGroundRow(kind: 'zone' | 'point', book: RowsEditor): Record<string, unknown> {
  if (kind === 'zone') return { materialId: materialNames(book)[0]?.id ?? null }
  return {
    name: nextName(
      book.rows('point').map((row) => String(row.body.name ?? '')),
      'P',
    ),
  }
}

/** Columns of every kind of row of section 2, for the names of its fields. */
export function groundColumns(book: RowsEditor, units: ProjectUnits): Record<string, SheetColumn[]> {
  return {
    material: materialColumns,
    zone: zoneColumns(units.length, materialNames(book)),
    point: pointColumns(units.length),
    'plan image': [{ field: 'opacity', label: 'Opacity of the plan', editor: 'number' }],
  }
}

export function MaterialSheet({ book, units, shared, uses }: GroundSheetProps) {
  const zones = book.rows('zone')
  return (
    <Sheet
      label="Materials"
      noun="material"
      units={units}
      columns={materialColumns}
      {...book.sheet('material')}
      {...shared}
      warnings={materialRemarks(book.sound<Material>('material'))}
      usedBy={(id) => [
        ...zones
          .filter((zone) => zone.body.materialId === id)
          .map((zone) => ({ words: `zone ${zone.body.name}`, holds: true })),
        // A zone on this page is known better here than in what the server last said.
        ...(uses[id] ?? []).filter((use) => !use.words.startsWith('zone ')),
      ]}
      empty="No material yet. Add one, or paste a block from a spreadsheet here."
    />
  )
}

export function ZoneSheet({ book, units, shared, uses }: GroundSheetProps) {
  const materials = materialNames(book)
  const key = JSON.stringify(materials)
  const { length } = units
  const columns = useMemo(() => zoneColumns(length, JSON.parse(key) as typeof materials), [length, key])
  return (
    <Sheet
      label="Zones"
      noun="zone"
      units={units}
      columns={columns}
      {...book.sheet('zone')}
      {...shared}
      newRow={() => newGroundRow('zone', book)}
      warnings={zoneRemarks(book.sound<Zone>('zone'))}
      usedBy={(id) => uses[id] ?? []}
      empty="No zone yet: say which material lies where, and between which levels."
    />
  )
}

export function PointSheet({ book, units, shared, uses }: GroundSheetProps) {
  const { length } = units
  const columns = useMemo(() => pointColumns(length), [length])
  return (
    <Sheet
      label="Named points"
      noun="point"
      units={units}
      columns={columns}
      {...book.sheet('point')}
      {...shared}
      newRow={() => newGroundRow('point', book)}
      warnings={pointRemarks(book.sound<Point>('point'))}
      usedBy={(id) => uses[id] ?? []}
      empty="No point yet. Heads are reported at named points, and instruments are compared there."
    />
  )
}

import { useMemo } from 'react'
import { nextName } from '~/book/next-name'
import type { Row } from '~/book/row'
import type { RowsEditor } from '~/book/use-rows'
import { Sheet, type SheetUse } from '~/components/sheet'
import type { SheetColumn } from '~/components/sheet-cells'
import type { Zone } from '~/ground/ground'
import type { SharedWithDrawing } from '~/ground/ground-sheets'
import type { ProjectUnits } from '~/units'
import {
  type Boundary,
  boundaryKinds,
  boundarySchema,
  fluxDirections,
  type RechargeZone,
  rechargeZoneSchema,
  type Wall,
  type Well,
  wallSchema,
  wellKinds,
  wellSchema,
} from './water'
import { boundaryRemarks, rechargeRemarks, wallRemarks, wellRemarks } from './water-remarks'

export const waterSchemas = {
  well: wellSchema,
  'recharge zone': rechargeZoneSchema,
  boundary: boundarySchema,
  wall: wallSchema,
}

interface WaterSheetProps {
  book: RowsEditor
  units: ProjectUnits
  shared: SharedWithDrawing
  /** Uses by rows of other sections, by the id of the used row. */
  uses: Readonly<Record<string, readonly SheetUse[]>>
}

function asChoices(words: readonly string[]) {
  return words.map((word) => ({ value: word, label: word }))
}

const source: SheetColumn = { field: 'source', label: 'Source', editor: 'text', width: 220 }

function isKind(...kinds: string[]) {
  return (body: Record<string, unknown>) => kinds.includes(String(body.kind))
}

/** Columns of every kind of row of section 3. */
export function waterColumns(length: ProjectUnits['length']) {
  return {
    well: [
      { field: 'name', label: 'Well', editor: 'text', width: 90 },
      { field: 'x', label: 'x', editor: 'number', unitText: length, width: 105 },
      { field: 'y', label: 'y', editor: 'number', unitText: length, width: 105 },
      { field: 'kind', label: 'Kind', editor: 'choice', choices: asChoices(wellKinds), width: 115 },
      {
        field: 'rate',
        label: 'Rate',
        editor: 'quantity',
        dimension: 'rate',
        note: 'No sign: the kind of the well says whether it takes water out or puts it in.',
      },
      {
        field: 'radius',
        label: 'Radius',
        editor: 'quantity',
        dimension: 'length',
        blank: 'not given',
        width: 110,
      },
      {
        field: 'lowestLevel',
        label: 'Lowest level',
        editor: 'quantity',
        dimension: 'length',
        blank: 'not given',
        note: 'Below this level the pump draws air.',
      },
      {
        field: 'screenTop',
        label: 'Screen top',
        editor: 'quantity',
        dimension: 'length',
        blank: 'full depth',
        width: 115,
        note: 'Level of the upper end of the screen. Plan flow takes every well as open over the whole depth: a run warns where that matters.',
      },
      {
        field: 'screenBottom',
        label: 'Screen bottom',
        editor: 'quantity',
        dimension: 'length',
        blank: 'full depth',
        width: 130,
        note: 'Level of the lower end of the screen.',
      },
      source,
    ],
    'recharge zone': [
      { field: 'name', label: 'Recharge zone', editor: 'text', width: 150 },
      {
        field: 'rate',
        label: 'Recharge',
        editor: 'quantity',
        dimension: 'conductivity',
        unit: length === 'm' ? 'mm/d' : 'in/a',
        note: 'Zones add up where they overlap.',
      },
      {
        field: 'polygon',
        label: 'Outline x y; x y; …',
        editor: 'vertices',
        unitText: length,
        blank: 'everywhere',
      },
      source,
    ],
    boundary: [
      { field: 'name', label: 'Boundary', editor: 'text', width: 130 },
      { field: 'kind', label: 'Kind', editor: 'choice', choices: asChoices(boundaryKinds), width: 160 },
      { field: 'line', label: 'Line x y; x y; …', editor: 'vertices', unitText: length, width: 200 },
      {
        field: 'levels',
        label: 'Head or drain level',
        editor: 'levels',
        dimension: 'length',
        width: 170,
        note: 'One level for the whole line, or one a vertex: 7.2; 7.0; 6.9',
        applies: isKind('fixed head', 'head-dependent flux', 'drain'),
      },
      {
        field: 'conductance',
        label: 'Conductance per length of line',
        editor: 'quantity',
        dimension: 'conductivity',
        width: 215,
        applies: isKind('head-dependent flux', 'drain'),
      },
      {
        field: 'disconnectsBelow',
        label: 'Disconnects below',
        editor: 'quantity',
        dimension: 'length',
        blank: 'never',
        width: 160,
        note: 'Below this head the flux no longer grows: the bed of a river that has come loose from the ground.',
        applies: isKind('head-dependent flux'),
      },
      {
        field: 'flux',
        label: 'Flux',
        editor: 'quantity',
        dimension: 'line flux',
        applies: isKind('specified flux'),
      },
      {
        field: 'direction',
        label: 'Direction',
        editor: 'choice',
        choices: asChoices(fluxDirections),
        width: 140,
        applies: isKind('specified flux'),
      },
      {
        field: 'outer',
        label: 'Outer',
        editor: 'checkbox',
        width: 80,
        note: 'Stands for distance, not for a real feature: a run may test what happens without it.',
      },
      source,
    ],
    wall: [
      { field: 'name', label: 'Wall', editor: 'text', width: 130 },
      { field: 'line', label: 'Line x y; x y; …', editor: 'vertices', unitText: length },
      { field: 'thickness', label: 'Thickness', editor: 'quantity', dimension: 'length' },
      {
        field: 'k',
        label: 'K of the wall',
        width: 175,
        editor: 'quantity',
        dimension: 'conductivity',
        note: 'Hydraulic conductivity; 0 is impermeable.',
      },
      {
        field: 'toe',
        label: 'Toe level',
        editor: 'quantity',
        dimension: 'length',
        blank: 'full depth',
        width: 115,
        note: 'Level of its lower end. Plan flow closes the whole depth: a run warns of a wall that ends above the base of the ground.',
      },
      source,
    ],
  } satisfies Record<string, SheetColumn[]>
}

/** Columns that stay the same object while the units do: the grid is built from them. */
function useWaterColumns(units: ProjectUnits) {
  const { length } = units
  return useMemo(() => waterColumns(length), [length])
}

export type WaterKind = keyof typeof waterSchemas

/** What a new row starts with, whether it comes from a sheet or from the drawing. */
export function newWaterRow(kind: WaterKind, book: RowsEditor): Record<string, unknown> {
  const names = book.rows(kind).map((row) => String(row.body.name ?? ''))
  switch (kind) {
    case 'well':
      return { name: nextName(names, 'W'), kind: 'abstraction' }
    case 'recharge zone':
      return { name: nextName(names, 'R') }
    case 'boundary':
      return { kind: 'fixed head', direction: 'into the model', outer: false }
    case 'wall':
      return {}
  }
}

export function WellSheet({
  book,
  units,
  shared,
  uses,
  zones,
}: WaterSheetProps & { zones: readonly Row<Zone>[] }) {
  const columns = useWaterColumns(units)
  return (
    <Sheet
      label="Wells"
      noun="well"
      units={units}
      columns={columns.well}
      {...book.sheet('well')}
      {...shared}
      newRow={() => newWaterRow('well', book)}
      warnings={wellRemarks(book.sound<Well>('well'), {
        zones,
        boundaries: book.sound<Boundary>('boundary'),
        units,
      })}
      usedBy={(id) => uses[id] ?? []}
      empty="No well yet. Add one, draw one, or paste a block from a spreadsheet here."
    />
  )
}

export function RechargeSheet({ book, units, shared, uses }: WaterSheetProps) {
  const columns = useWaterColumns(units)
  return (
    <Sheet
      label="Recharge zones"
      noun="recharge zone"
      units={units}
      columns={columns['recharge zone']}
      {...book.sheet('recharge zone')}
      {...shared}
      newRow={() => newWaterRow('recharge zone', book)}
      warnings={rechargeRemarks(book.sound<RechargeZone>('recharge zone'))}
      usedBy={(id) => uses[id] ?? []}
      empty="No recharge zone yet."
    />
  )
}

export function BoundarySheet({ book, units, shared, uses }: WaterSheetProps) {
  const columns = useWaterColumns(units)
  return (
    <Sheet
      label="Boundaries"
      noun="boundary"
      nouns="boundaries"
      units={units}
      columns={columns.boundary}
      {...book.sheet('boundary')}
      {...shared}
      newRow={() => newWaterRow('boundary', book)}
      warnings={boundaryRemarks(book.sound<Boundary>('boundary'))}
      usedBy={(id) => uses[id] ?? []}
      empty="No boundary yet: without one, nothing fixes the head. An edge of the grid without a boundary lets no water through."
    />
  )
}

export function WallSheet({ book, units, shared, uses }: WaterSheetProps) {
  const columns = useWaterColumns(units)
  return (
    <Sheet
      label="Cut-off walls"
      noun="wall"
      units={units}
      columns={columns.wall}
      {...book.sheet('wall')}
      {...shared}
      warnings={wallRemarks(book.sound<Wall>('wall'))}
      usedBy={(id) => uses[id] ?? []}
      empty="No cut-off wall yet."
    />
  )
}

import {
  type CellClassParams,
  CellStyleModule,
  CheckboxEditorModule,
  ClientSideRowModelApiModule,
  ClientSideRowModelModule,
  type ColDef,
  ColumnApiModule,
  type EditableCallbackParams,
  EventApiModule,
  type GridApi,
  type ICellRendererParams,
  type IHeaderParams,
  LargeTextEditorModule,
  ModuleRegistry,
  RenderApiModule,
  RowApiModule,
  RowAutoHeightModule,
  RowSelectionModule,
  RowStyleModule,
  ScrollApiModule,
  SelectEditorModule,
  TextEditorModule,
  TooltipModule,
  themeQuartz,
  type ValueFormatterParams,
  type ValueGetterParams,
  type ValueSetterParams,
} from 'ag-grid-community'
import { AgGridReact } from 'ag-grid-react'
import { type RefObject, useEffect, useMemo, useRef, useState } from 'react'
import { useNonce } from './nonce'
import type { SheetProps, SheetRow } from './sheet'
import { cellText, compareCells, headerUnit, readCell, type SheetColumn, shownCell } from './sheet-cells'
import { isFigure } from './sheet-table'
import './sheet.css'

ModuleRegistry.registerModules([
  CellStyleModule,
  CheckboxEditorModule,
  ClientSideRowModelApiModule,
  ClientSideRowModelModule,
  ColumnApiModule,
  EventApiModule,
  LargeTextEditorModule,
  RenderApiModule,
  RowApiModule,
  RowAutoHeightModule,
  RowSelectionModule,
  RowStyleModule,
  ScrollApiModule,
  SelectEditorModule,
  TextEditorModule,
  TooltipModule,
])

/** The calculation pad's own paper, ink and rules; the tokens change with the theme of the page by themselves. */
const pad = themeQuartz.withParams({
  accentColor: 'var(--bourne)',
  backgroundColor: 'var(--chalk)',
  foregroundColor: 'var(--flint)',
  textColor: 'var(--flint)',
  borderColor: 'var(--rule)',
  rowBorder: { color: 'var(--rule)', width: 1 },
  columnBorder: { color: 'var(--chalk-3)', width: 1 },
  headerColumnBorder: false,
  wrapperBorder: { color: 'var(--rule)', width: 1 },
  wrapperBorderRadius: 0,
  borderRadius: 2,
  headerBackgroundColor: 'var(--chalk-2)',
  headerTextColor: 'var(--flint)',
  headerFontWeight: 600,
  headerRowBorder: { color: 'var(--flint-2)', width: 1 },
  headerColumnResizeHandleColor: 'var(--rule)',
  oddRowBackgroundColor: 'var(--chalk)',
  rowHoverColor: 'var(--chalk-2)',
  selectedRowBackgroundColor: 'var(--bourne-2)',
  cellEditingBorder: { color: 'var(--bourne)', width: 2 },
  inputFocusBorder: { color: 'var(--bourne)' },
  inputBackgroundColor: 'var(--chalk)',
  menuBackgroundColor: 'var(--chalk)',
  tooltipBackgroundColor: 'var(--chalk-3)',
  tooltipTextColor: 'var(--flint)',
  browserColorScheme: 'inherit',
  fontFamily: 'inherit',
  fontSize: 14,
  headerFontSize: 14,
  spacing: 5,
  rowHeight: 31,
  headerHeight: 32,
  cellHorizontalPadding: 9,
  autoHeightMinBodyHeight: 34,
})

interface SheetGridProps extends SheetProps {
  /** Row to put the cursor in: somebody just added it. */
  focusId: string | null
  onFocused: () => void
  onPick: (ids: readonly string[]) => void
  onDelete: (ids: readonly string[]) => void
  focused: RefObject<{ rowId: string; field: string } | null>
  order: RefObject<readonly string[]>
}

interface HeaderParams extends IHeaderParams {
  unit: string
}

function ColumnHead({ displayName, unit }: HeaderParams) {
  return (
    <span>
      {displayName}
      {unit && <span className="ml-1 text-[0.82em] font-normal text-flint-2">{unit}</span>}
    </span>
  )
}

/** What is wrong with a cell, or to consider about it. */
function noteOf(props: SheetProps, row: SheetRow, field: string): { wrong: boolean; message: string } | null {
  const typed = row.typed?.[field]
  if (typed) return { wrong: true, message: typed.message }
  const problem = row.problems?.find((one) => one.field.split('.')[0] === field)
  if (problem) return { wrong: true, message: problem.message }
  const warning = props.warnings?.[row.id]?.find((one) => one.field === field)
  return warning ? { wrong: false, message: warning.message } : null
}

function applies(column: SheetColumn, row: SheetRow | undefined): boolean {
  return !column.applies || !row || column.applies(row.body)
}

/** The grid in the browser. It keeps no value of its own: every edit goes up, every row comes down. */
export function SheetGrid(props: SheetGridProps) {
  const { rows, columns, units, edits, selectedId = null, hoveredId = null, tall = 14 } = props
  const nonce = useNonce()
  const frame = useRef<HTMLDivElement>(null)
  const latest = useRef(props)
  latest.current = props
  const [api, setApi] = useState<GridApi<SheetRow> | null>(null)
  const editable = edits !== undefined

  // Loaders hand out the same units as a new object each time; new definitions would draw every heading again.
  const { length, time } = units
  const definitions = useMemo(
    () => columns.map((column, index) => definition(column, index, editable, { length, time }, latest)),
    [columns, length, time, editable],
  )

  // Row objects change whenever anything about a row does, so a refresh after new rows is enough, except for notes
  // that come from elsewhere.
  const warnings = props.warnings
  useEffect(() => {
    if (api && warnings) api.refreshCells({ force: true })
  }, [api, warnings])

  useEffect(() => {
    const { focusId, onFocused } = latest.current
    if (!api || !focusId || !rows.some((row) => row.id === focusId)) return
    const node = api.getRowNode(focusId)
    const first = columns.find((column) => !column.reads)
    if (!node || node.rowIndex === null || !first) return
    api.ensureIndexVisible(node.rowIndex)
    api.setFocusedCell(node.rowIndex, first.field)
    api.startEditingCell({ rowIndex: node.rowIndex, colKey: first.field })
    onFocused()
  }, [api, rows, columns])

  useMarkedRow(frame, hoveredId, 'sheet-pointed', rows)
  useMarkedRow(frame, selectedId, 'sheet-chosen', rows)
  useEffect(() => {
    const node = selectedId ? api?.getRowNode(selectedId) : undefined
    if (node) api?.ensureNodeVisible(node)
  }, [api, selectedId])

  const scrolls = rows.length > tall
  return (
    <div ref={frame} style={scrolls ? { height: `${tall * 31 + 50}px` } : undefined}>
      <AgGridReact<SheetRow>
        theme={pad}
        styleNonce={nonce}
        rowData={rows as SheetRow[]}
        columnDefs={definitions}
        getRowId={({ data }) => data.id}
        domLayout={scrolls ? 'normal' : 'autoHeight'}
        defaultColDef={{ resizable: true, sortable: true, suppressMovable: true, minWidth: 58 }}
        rowSelection={
          editable
            ? { mode: 'multiRow', checkboxes: true, headerCheckbox: true, enableClickSelection: false }
            : undefined
        }
        selectionColumnDef={{ pinned: 'left', width: 36, minWidth: 36, maxWidth: 36, resizable: false }}
        stopEditingWhenCellsLoseFocus
        enterNavigatesVertically
        enterNavigatesVerticallyAfterEdit
        suppressDragLeaveHidesColumns
        suppressScrollOnNewData
        tooltipShowDelay={300}
        ensureDomOrder
        animateRows={false}
        noRowsOverlayComponent={() => (
          <span className="text-flint-2">{props.empty ?? `No ${props.nouns ?? `${props.noun}s`} yet.`}</span>
        )}
        rowClassRules={{
          'sheet-unsaved': ({ data }) => data?.state === 'unsaved',
          'sheet-conflict': ({ data }) => data?.state === 'conflict',
        }}
        onGridReady={(event) => setApi(event.api)}
        onModelUpdated={({ api: grid }) => {
          const ids: string[] = []
          grid.forEachNodeAfterFilterAndSort((node) => {
            if (node.id) ids.push(node.id)
          })
          props.order.current = ids
        }}
        onSelectionChanged={({ api: grid }) =>
          props.onPick(grid.getSelectedNodes().flatMap((n) => n.id ?? []))
        }
        onCellFocused={({ rowIndex, column, api: grid }) => {
          const node = rowIndex === null ? undefined : grid.getDisplayedRowAtIndex(rowIndex)
          const field = typeof column === 'object' ? column?.getColId() : column
          if (!node?.id || !field) return
          props.focused.current = { rowId: node.id, field }
          latest.current.onSelect?.(node.id)
        }}
        onCellMouseOver={({ data }) => latest.current.onHover?.(data?.id ?? null)}
        onCellMouseOut={() => latest.current.onHover?.(null)}
        onCellKeyDown={({ event, node, api: grid }) => {
          if (!(event instanceof KeyboardEvent) || event.key !== 'Delete' || !event.shiftKey) return
          const chosen = grid.getSelectedNodes().flatMap((one) => one.id ?? [])
          props.onDelete(chosen.length > 0 ? chosen : node.id ? [node.id] : [])
        }}
      />
    </div>
  )
}

/** Marks a row without redrawing it, so that neither the cursor nor a cell under edit is disturbed. */
function useMarkedRow(
  frame: RefObject<HTMLDivElement | null>,
  id: string | null,
  mark: string,
  rows: readonly SheetRow[],
) {
  // biome-ignore lint/correctness/useExhaustiveDependencies: new rows come with new elements, to be marked again
  useEffect(() => {
    if (!id) return
    const elements = [...(frame.current?.querySelectorAll(`[row-id="${CSS.escape(id)}"]`) ?? [])]
    for (const element of elements) element.classList.add(mark)
    return () => {
      for (const element of elements) element.classList.remove(mark)
    }
  }, [frame, id, mark, rows])
}

function definition(
  column: SheetColumn,
  index: number,
  editable: boolean,
  units: SheetProps['units'],
  latest: RefObject<SheetGridProps>,
): ColDef<SheetRow> {
  const canEdit = editable && !column.reads
  const rowOf = (params: { data?: SheetRow }) => params.data
  const value = (row: SheetRow) => row.body[column.field]
  const isCheckbox = column.editor === 'checkbox'
  const unit = headerUnit(column, units)
  return {
    colId: column.field,
    headerName: column.label,
    headerTooltip: column.note,
    headerComponentParams: { innerHeaderComponent: ColumnHead, innerHeaderComponentParams: { unit } },
    pinned: index === 0 ? 'left' : undefined,
    headerClass: isFigure(column) ? 'ag-right-aligned-header' : undefined,
    ...widthOf(column, index),
    wrapText: column.long,
    autoHeight: column.long,
    editable: ({ data }: EditableCallbackParams<SheetRow>) => canEdit && applies(column, data),
    valueGetter: (params: ValueGetterParams<SheetRow>) => {
      const row = rowOf(params)
      if (!row) return ''
      if (column.reads) return column.reads(row.body)
      if (isCheckbox) return row.body[column.field] === true
      return row.typed?.[column.field]?.text ?? cellText(column, value(row), units)
    },
    valueSetter: ({ data, newValue }: ValueSetterParams<SheetRow>) => {
      const text = newValue === null || newValue === undefined ? '' : String(newValue)
      const input = isCheckbox
        ? { ok: true as const, value: newValue === true || newValue === 'yes' }
        : readCell(column, text, units)
      latest.current.edits?.apply([{ op: 'set', id: data.id, cells: { [column.field]: input } }])
      return true
    },
    valueFormatter: isCheckbox ? (params: ValueFormatterParams) => (params.value ? 'yes' : 'no') : undefined,
    comparator: (_a, _b, left, right) => {
      const [a, b] = [left.data, right.data]
      if (!a || !b) return 0
      return column.reads
        ? column.reads(a.body).localeCompare(column.reads(b.body), 'en', { numeric: true })
        : compareCells(column, value(a), value(b), units)
    },
    cellRenderer: isCheckbox
      ? 'agCheckboxCellRenderer'
      : (params: ICellRendererParams<SheetRow>) => {
          const row = params.data
          if (!row) return null
          if (!applies(column, row)) return <span className="text-rule">–</span>
          if (column.reads) return column.reads(row.body)
          const typed = row.typed?.[column.field]
          if (typed) return typed.text
          const shown = shownCell(column, value(row), units)
          if (shown.text === '') return <span className="text-flint-2 italic">{column.blank ?? ''}</span>
          return (
            <>
              {shown.text}
              {shown.entered && (
                <span className="ml-1.5 text-[0.82em] text-flint-2" title="as entered">
                  {shown.entered}
                </span>
              )}
            </>
          )
        },
    cellEditor:
      column.editor === 'choice'
        ? 'agSelectCellEditor'
        : isLong(column)
          ? 'agLargeTextCellEditor'
          : 'agTextCellEditor',
    cellEditorPopup: isLong(column),
    cellEditorParams:
      column.editor === 'choice'
        ? { values: column.choices?.map((choice) => choice.label) ?? [] }
        : isLong(column)
          ? { maxLength: 100_000, rows: 6, cols: 54 }
          : undefined,
    ...(isCheckbox ? { cellEditor: 'agCheckboxCellEditor', cellEditorPopup: false } : {}),
    tooltipValueGetter: ({ data }) => {
      const note = data && noteOf(latest.current, data, column.field)
      if (note) return note.message
      return data && column.editor === 'vertices' ? cellText(column, value(data), units) : undefined
    },
    cellClass: index === 0 ? 'font-semibold' : undefined,
    cellClassRules: {
      'ag-right-aligned-cell': () => isFigure(column),
      'sheet-wrapped': () => column.long === true,
      'sheet-wrong': (params: CellClassParams<SheetRow>) =>
        Boolean(params.data && noteOf(latest.current, params.data, column.field)?.wrong),
      'sheet-consider': (params: CellClassParams<SheetRow>) =>
        Boolean(params.data && noteOf(latest.current, params.data, column.field)?.wrong === false),
    },
  }
}

/** A list of vertices is edited in a larger box too: a river has dozens. */
function isLong(column: SheetColumn): boolean {
  return column.long === true || column.editor === 'vertices'
}

function widthOf(column: SheetColumn, index: number): Pick<ColDef, 'width' | 'flex' | 'minWidth'> {
  if (index === 0) return { width: column.width ?? 130 }
  if (column.long) return { flex: 2, minWidth: column.width ?? 200 }
  if (column.editor === 'vertices') return { flex: 1, minWidth: column.width ?? 190 }
  if (column.width) return { width: column.width }
  switch (column.editor) {
    case 'checkbox':
      return { width: 90 }
    case 'text':
      return { flex: 1, minWidth: 160 }
    default:
      return { width: 125 }
  }
}

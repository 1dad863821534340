import {
  convert,
  type Dimension,
  formatNumber,
  type ParsedQuantity,
  type ProjectUnits,
  parseQuantity,
  type Quantity,
  shownUnit,
  type UnitName,
  unitLabel,
} from '~/units'

/** What a person can type into a column, and how it is kept in the row. */
export type CellEditor =
  /** Kept as a string. */
  | 'text'
  /** Kept as { value, unit } exactly as entered, shown in the column's unit. Needs `dimension`. */
  | 'quantity'
  /** Kept as a number: a coordinate in the project's length unit, or a fraction. */
  | 'number'
  /** Kept as the value of one of `choices`. */
  | 'choice'
  /** Kept as [x, y][], typed "x y; x y; …" in the project's length unit. */
  | 'vertices'
  /** Kept as Quantity[], typed "7.2; 7.0" or "23 ft; 22 ft". Needs `dimension`. */
  | 'levels'
  /** Kept as true or false. */
  | 'checkbox'

export interface SheetChoice {
  value: string
  label: string
}

export interface SheetColumn {
  /** Field of the row's body. */
  field: string
  label: string
  editor: CellEditor
  /** Dimension of a quantity or of levels; the header shows the project's unit for it. */
  dimension?: Dimension
  /** Unit of this column where it is not the one the project shows for the dimension: mm/d for recharge, say. */
  unit?: UnitName
  /** Printed after the label of a number column: the project's length unit beside a coordinate. */
  unitText?: string
  choices?: readonly SheetChoice[]
  /** What an empty cell means, printed faintly in it: "everywhere", "not known". */
  blank?: string
  /** Explained when the header is pointed at. */
  note?: string
  /** A paragraph: wraps, grows its row, and has a larger box to type in. */
  long?: boolean
  /** False where the cell means nothing for this row (a flux on a fixed head): shown struck out, not editable. */
  applies?: (body: Record<string, unknown>) => boolean
  /** Computed for reading only; never typed, never pasted. */
  reads?: (body: Record<string, unknown>) => string
  width?: number
}

/** What a cell became after a person typed in it: a value, or the text kept with what is wrong with it. */
export type CellInput = { ok: true; value: unknown } | { ok: false; text: string; message: string }

type Vertex = readonly [number, number]

export function columnUnit(column: SheetColumn, units: ProjectUnits): UnitName | undefined {
  if (column.unit) return column.unit
  return column.dimension ? shownUnit(column.dimension, units) : undefined
}

/** The unit printed in the header, '' for none. */
export function headerUnit(column: SheetColumn, units: ProjectUnits): string {
  const unit = columnUnit(column, units)
  if (unit) return unit === '-' ? '' : unitLabel(unit)
  return column.unitText ?? ''
}

/** A number with every digit that was entered, grouped for reading: inputs are never rounded on the page. */
export function enteredNumber(value: number): string {
  const plain = String(Number(value.toPrecision(14)))
  if (plain.includes('e')) return formatNumber(value)
  const [whole = '', fraction] = plain.replace('-', '').split('.')
  const grouped = whole.length > 4 ? whole.replace(/\B(?=(\d{3})+$)/g, '\u202f') : whole
  return (value < 0 ? '−' : '') + (fraction === undefined ? grouped : `${grouped}.${fraction}`)
}

/** The text a person edits: what they typed before, digit for digit. */
export function cellText(column: SheetColumn, value: unknown, units: ProjectUnits): string {
  if (value === null || value === undefined) return ''
  switch (column.editor) {
    case 'quantity':
      return quantityText(value as Quantity, columnUnit(column, units))
    case 'levels':
      return (value as Quantity[]).map((one) => quantityText(one, columnUnit(column, units))).join('; ')
    case 'vertices':
      return (value as Vertex[]).map(([x, y]) => `${x} ${y}`).join('; ')
    case 'choice':
      return column.choices?.find((choice) => choice.value === value)?.label ?? String(value)
    case 'checkbox':
      return value ? 'yes' : 'no'
    case 'number':
    case 'text':
      return String(value)
  }
}

function quantityText(quantity: Quantity, unit: UnitName | undefined): string {
  return quantity.unit === unit ? String(quantity.value) : `${quantity.value} ${unitLabel(quantity.unit)}`
}

/** What a cell shows: the value in the column's unit and, where another unit was entered, what was entered. */
export interface ShownCell {
  text: string
  entered?: string
}

export function shownCell(column: SheetColumn, value: unknown, units: ProjectUnits): ShownCell {
  if (value === null || value === undefined || value === '') return { text: '' }
  const unit = columnUnit(column, units)
  if (column.editor === 'quantity' && unit) return shownQuantity(value as Quantity, unit)
  if (column.editor === 'levels' && unit) {
    const shown = (value as Quantity[]).map((one) => shownQuantity(one, unit))
    const entered = shown.some((one) => one.entered)
      ? (value as Quantity[]).map((one) => quantityText(one, unit)).join('; ')
      : undefined
    return { text: shown.map((one) => one.text).join('; '), entered }
  }
  if (column.editor === 'number') return { text: enteredNumber(value as number) }
  return { text: cellText(column, value, units) }
}

function shownQuantity(quantity: Quantity, unit: UnitName): ShownCell {
  if (quantity.unit === unit) return { text: enteredNumber(quantity.value) }
  return {
    text: formatNumber(convert(quantity, unit)),
    entered: `${enteredNumber(quantity.value)} ${unitLabel(quantity.unit)}`,
  }
}

/** Reads what was typed or pasted into a cell. Blank is always taken: the row's own rules say whether it may be. */
export function readCell(column: SheetColumn, typed: string, units: ProjectUnits): CellInput {
  const text = typed.trim()
  if (column.editor === 'text') return { ok: true, value: column.long ? typed.trimEnd() : text }
  if (column.editor === 'checkbox') return readCheckbox(text)
  if (text === '') return { ok: true, value: null }
  switch (column.editor) {
    case 'choice':
      return readChoice(column, text)
    case 'number': {
      const read = parseQuantity(text, 'none', '-')
      return read.ok ? { ok: true, value: read.quantity.value } : { ok: false, text, message: read.message }
    }
    case 'quantity':
      return fromQuantity(text, parseInColumn(column, text, units))
    case 'levels':
      return readLevels(column, text, units)
    case 'vertices':
      return readVertices(text)
  }
}

function parseInColumn(column: SheetColumn, text: string, units: ProjectUnits): ParsedQuantity {
  const dimension = column.dimension
  const unit = columnUnit(column, units)
  if (!dimension || !unit) throw new Error(`The column ${column.field} needs a dimension.`)
  return parseQuantity(text, dimension, unit)
}

function fromQuantity(text: string, read: ParsedQuantity): CellInput {
  return read.ok ? { ok: true, value: read.quantity } : { ok: false, text, message: read.message }
}

function readCheckbox(text: string): CellInput {
  if (/^(yes|true|1|x|✓)$/i.test(text)) return { ok: true, value: true }
  if (/^(no|false|0|)$/i.test(text)) return { ok: true, value: false }
  return { ok: false, text, message: `"${text}" is neither yes nor no.` }
}

function readChoice(column: SheetColumn, text: string): CellInput {
  const wanted = text.toLowerCase()
  const choice = column.choices?.find(
    ({ value, label }) => value.toLowerCase() === wanted || label.toLowerCase() === wanted,
  )
  if (choice) return { ok: true, value: choice.value }
  const allowed = column.choices?.map(({ label }) => label).join(', ') || 'nothing to choose from yet'
  return { ok: false, text, message: `"${text}" is not one of: ${allowed}.` }
}

function readLevels(column: SheetColumn, text: string, units: ProjectUnits): CellInput {
  const levels: Quantity[] = []
  for (const part of text.split(/[;\n]/).filter((one) => one.trim() !== '')) {
    const read = parseInColumn(column, part, units)
    if (!read.ok) return { ok: false, text, message: read.message }
    levels.push(read.quantity)
  }
  return { ok: true, value: levels }
}

function readVertices(text: string): CellInput {
  const vertices: [number, number][] = []
  for (const part of text.split(/[;\n]/).filter((one) => one.trim() !== '')) {
    // "x y", "x, y" and a pair of spreadsheet cells; decimals take a point here, since a comma may part x from y.
    const numbers = part
      .trim()
      .replace(/−/g, '-')
      .split(/\s*,\s*|\s+/)
      .map((word) => (word === '' ? Number.NaN : Number(word)))
    const [x, y] = numbers
    if (numbers.length !== 2 || !Number.isFinite(x) || !Number.isFinite(y)) {
      return {
        ok: false,
        text,
        message: `"${part.trim()}" is not a vertex: write x and y, as in 120.5 80; 140 95.`,
      }
    }
    vertices.push([x as number, y as number])
  }
  return { ok: true, value: vertices }
}

/** Order of two cells of a column when the sheet is sorted: numbers by size, empty cells last. */
export function compareCells(column: SheetColumn, a: unknown, b: unknown, units: ProjectUnits): number {
  const [left, right] = [sortKey(column, a, units), sortKey(column, b, units)]
  if (left === null || right === null) return left === right ? 0 : left === null ? 1 : -1
  if (typeof left === 'number' && typeof right === 'number') return left - right
  return String(left).localeCompare(String(right), 'en', { numeric: true })
}

function sortKey(column: SheetColumn, value: unknown, units: ProjectUnits): number | string | null {
  if (value === null || value === undefined || value === '') return null
  const unit = columnUnit(column, units)
  if (column.editor === 'quantity' && unit) return convert(value as Quantity, unit)
  if (column.editor === 'levels' && unit) {
    const [first] = value as Quantity[]
    return first ? convert(first, unit) : null
  }
  if (column.editor === 'number') return value as number
  if (column.editor === 'vertices') return (value as Vertex[]).length
  return cellText(column, value, units)
}

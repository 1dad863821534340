import type { Row } from '~/book/row'
import {
  convert,
  type Dimension,
  formatNumber,
  type ProjectUnits,
  parseQuantity,
  type Quantity,
  shownUnit,
  type UnitName,
  unitLabel,
} from '~/units'
import {
  type Case,
  type CaseMethod,
  defaultMethod,
  defaultTolerance,
  defaultVerify,
  type Extent,
  methodWords,
  type Overridable,
  overrideDimension,
  overrideOf,
} from './case'
import type { CaseInputs } from './freeze'
import { gridSize } from './grid-size'

/** What a cell of the case sheet became after somebody typed in it. */
export type LineInput = { ok: true; set: Partial<Case> } | { ok: false; message: string }

/** One line of the case sheet: a quantity, with a cell for each case. */
export interface SheetLine {
  key: string
  group: string
  label: string
  /** Printed after the label: the kind of a well, say. */
  note?: string
  unit: string
  /** Allowed words, where the cell is a choice. */
  choices?: readonly string[]
  /** Computed from the lines above; never typed. */
  computed?: boolean
  /** Free text, which inherits nothing. */
  words?: boolean
  /** In the base case the cell shows the row of section 2 or 3, where it is edited. */
  baseFrom?: 'ground' | 'water'
  /** What the case itself says, as it is edited; '' where it says nothing. */
  own: (body: Case) => string
  /** What holds where the case says nothing. */
  inherited: (body: Case) => string
  read: (body: Case, text: string) => LineInput
}

const sides = [
  ['xMin', 'x from'],
  ['xMax', 'x to'],
  ['yMin', 'y from'],
  ['yMax', 'y to'],
] as const satisfies readonly (readonly [keyof Extent, string])[]

/** The lines of the sheet: settings and grid, then every quantity of sections 2 and 3 that a case may set. */
export function sheetLines(inputs: CaseInputs, base: Case | undefined): SheetLine[] {
  return [...settingLines(inputs.project.units, base), ...rowLines(inputs)]
}

function settingLines(units: ProjectUnits, base: Case | undefined): SheetLine[] {
  const group = 'Flow and grid'
  const from = (body: Case) => (body.isBase ? undefined : base)
  const extentInForce = (body: Case) => body.extent ?? from(body)?.extent ?? null
  const sizeInForce = (body: Case) => body.cellSize ?? from(body)?.cellSize ?? null
  return [
    {
      key: 'note',
      group,
      label: 'What it is for',
      unit: '',
      words: true,
      own: (body) => body.note,
      inherited: () => '',
      read: (_body, text) => ({ ok: true, set: { note: text.trim() } }),
    },
    {
      key: 'flow',
      group,
      label: 'Flow',
      unit: '',
      choices: ['confined', 'unconfined'],
      own: (body) => body.flow ?? '',
      inherited: (body) => from(body)?.flow ?? '',
      read: (_body, text) => {
        const word = text.trim().toLowerCase()
        if (word === '') return { ok: true, set: { flow: null } }
        if (word === 'confined' || word === 'unconfined') return { ok: true, set: { flow: word } }
        return { ok: false, message: `"${text}" is neither confined nor unconfined.` }
      },
    },
    ...sides.map(
      ([side, label]): SheetLine => ({
        key: side,
        group,
        label: `Extent, ${label}`,
        unit: units.length,
        own: (body) =>
          body.extent && (body.isBase || body.extent[side] !== from(body)?.extent?.[side])
            ? String(body.extent[side])
            : '',
        inherited: (body) => plain(from(body)?.extent?.[side]),
        read: (body, text) => readExtent(body, from(body)?.extent ?? null, side, text),
      }),
    ),
    {
      key: 'cellSize',
      group,
      label: 'Cell size',
      unit: units.length,
      own: (body) => (body.cellSize ? quantityText(body.cellSize, units.length) : ''),
      inherited: (body) => {
        const size = from(body)?.cellSize
        return size ? shown(size, units.length) : ''
      },
      read: (_body, text) => {
        if (text.trim() === '') return { ok: true, set: { cellSize: null } }
        const read = parseQuantity(text, 'length', units.length)
        return read.ok ? { ok: true, set: { cellSize: read.quantity } } : read
      },
    },
    {
      key: 'cells',
      group,
      label: 'Cells',
      unit: '',
      computed: true,
      own: (body) => {
        const extent = extentInForce(body)
        const size = sizeInForce(body)
        if (!extent || !size || size.value <= 0) return ''
        const grid = gridSize(extent, size, units)
        return `${grid.columns} × ${grid.rows} = ${formatNumber(grid.cells, 0)}`
      },
      inherited: () => '',
      read: () => ({ ok: true, set: {} }),
    },
    {
      key: 'tolerance',
      group,
      label: 'Solver tolerance',
      note: 'relative residual',
      unit: '',
      own: (body) => (body.tolerance === null ? '' : String(body.tolerance)),
      inherited: (body) => String(from(body)?.tolerance ?? defaultTolerance),
      read: (_body, text) => {
        if (text.trim() === '') return { ok: true, set: { tolerance: null } }
        const read = parseQuantity(text, 'none', '-')
        return read.ok ? { ok: true, set: { tolerance: read.quantity.value } } : read
      },
    },
    {
      key: 'method',
      group,
      label: 'Method',
      unit: '',
      choices: Object.values(methodWords),
      own: (body) => (body.method ? methodWords[body.method] : ''),
      inherited: (body) => methodWords[from(body)?.method ?? defaultMethod],
      read: (_body, text) => {
        const word = text.trim().toLowerCase()
        if (word === '') return { ok: true, set: { method: null } }
        const method = (Object.keys(methodWords) as CaseMethod[]).find((one) => methodWords[one] === word)
        return method
          ? { ok: true, set: { method } }
          : { ok: false, message: `"${text}" is none of ${Object.values(methodWords).join(', ')}.` }
      },
    },
    {
      key: 'verify',
      group,
      label: 'Verification',
      note: 'other grids, outer boundary',
      unit: '',
      choices: Object.values(verifyWords),
      own: (body) => verifyText(body.verify),
      inherited: (body) => verifyText(from(body)?.verify ?? defaultVerify),
      read: (_body, text) => {
        const word = text.trim().toLowerCase()
        if (word === '') return { ok: true, set: { verify: null } }
        if (word === verifyWords.yes || word === verifyWords.no)
          return { ok: true, set: { verify: word === verifyWords.yes } }
        return { ok: false, message: `"${text}" is neither ${verifyWords.yes} nor ${verifyWords.no}.` }
      },
    },
  ]
}

const verifyWords = { yes: 'with error bands', no: 'none' } as const

function verifyText(verify: boolean | null | undefined): string {
  if (verify === null || verify === undefined) return ''
  return verify ? verifyWords.yes : verifyWords.no
}

function readExtent(body: Case, base: Extent | null, side: keyof Extent, text: string): LineInput {
  const inForce = body.extent ?? base
  if (!inForce) return { ok: false, message: 'The base case needs its extent first.' }
  let value: number
  if (text.trim() === '') {
    if (!base) return { ok: false, message: 'The base case needs this.' }
    value = base[side]
  } else {
    const read = parseQuantity(text, 'none', '-')
    if (!read.ok) return read
    value = read.quantity.value
  }
  const extent = { ...inForce, [side]: value }
  if (extent.xMax <= extent.xMin || extent.yMax <= extent.yMin)
    return { ok: false, message: 'The extent must have a width and a height.' }
  const asBase = base !== null && sides.every(([one]) => extent[one] === base[one])
  return { ok: true, set: { extent: asBase ? null : extent } }
}

function rowLines(inputs: CaseInputs): SheetLine[] {
  const { units } = inputs.project
  const line = (
    group: string,
    row: Row<{ name: string }>,
    quantity: Overridable,
    section: 'ground' | 'water',
    value: Quantity | null,
    options: { note?: string; shownAs?: string } = {},
  ): SheetLine => {
    const dimension = overrideDimension[quantity]
    // A line keeps the unit in which its row was entered: recharge stays in mm/d if that is how it was given.
    const unit: UnitName = value?.unit ?? shownUnit(dimension, units)
    const before = options.shownAs ?? (value ? shown(value, unit) : '')
    const base = inputs.cases.find((one) => one.body.isBase)?.body
    return {
      key: `${row.id} ${quantity}`,
      group,
      label: row.body.name,
      note: options.note,
      unit: unitLabel(unit),
      baseFrom: section,
      own: (body) => {
        const set = overrideOf(body.overrides, row.id, quantity)
        return set ? quantityText(set, unit) : ''
      },
      inherited: (body) => {
        const set = body.isBase || !base ? undefined : overrideOf(base.overrides, row.id, quantity)
        return set ? shown(set, unit) : before
      },
      read: (body, text) => readOverride(body, row.id, quantity, dimension, unit, text),
    }
  }
  return [
    ...inputs.materials.map((row) =>
      line('Hydraulic conductivity K', row, 'k', 'ground', row.body.kx, {
        note: sameQuantity(row.body.kx, row.body.ky) ? undefined : 'kx; ky keeps its ratio',
      }),
    ),
    ...inputs.wells.map((row) => line('Wells', row, 'rate', 'water', row.body.rate, { note: row.body.kind })),
    ...inputs.rechargeZones.map((row) => line('Recharge', row, 'recharge', 'water', row.body.rate)),
    ...inputs.boundaries.map((row) => {
      const { kind, levels, flux, direction } = row.body
      if (kind === 'specified flux')
        return line('Boundaries', row, 'flux', 'water', flux, { note: `flux ${direction}` })
      const all = levels ?? []
      const unit = all[0]?.unit ?? units.length
      return line('Boundaries', row, 'level', 'water', all[0] ?? null, {
        note: kind === 'drain' ? 'drain, level' : kind,
        shownAs: all.length > 1 ? along(all, unit) : undefined,
      })
    }),
    ...inputs.walls.map((row) => line('Cut-off walls, K', row, 'k', 'water', row.body.k)),
  ]
}

function readOverride(
  body: Case,
  rowId: string,
  quantity: Overridable,
  dimension: Dimension,
  unit: UnitName,
  text: string,
): LineInput {
  const others = body.overrides.filter((o) => o.rowId !== rowId || o.quantity !== quantity)
  if (text.trim() === '') return { ok: true, set: { overrides: others } }
  const read = parseQuantity(text, dimension, unit)
  if (!read.ok) return read
  if (quantity !== 'level' && read.quantity.value < 0)
    return { ok: false, message: 'No sign here: the direction is chosen in section 3.' }
  return { ok: true, set: { overrides: [...others, { rowId, quantity, value: read.quantity }] } }
}

/** Levels by vertex in short: lowest to highest. */
function along(levels: readonly Quantity[], unit: UnitName): string {
  const values = levels.map((one) => convert(one, unit))
  const low = Math.min(...values)
  const high = Math.max(...values)
  return low === high ? plain(low) : `${plain(low)} to ${plain(high)}`
}

function sameQuantity(a: Quantity, b: Quantity): boolean {
  return convert(a, b.unit) === b.value
}

/** As a person would type it again. */
function quantityText(quantity: Quantity, unit: UnitName): string {
  return quantity.unit === unit ? String(quantity.value) : `${quantity.value} ${unitLabel(quantity.unit)}`
}

function shown(quantity: Quantity, unit: UnitName): string {
  return quantity.unit === unit ? plain(quantity.value) : formatNumber(convert(quantity, unit))
}

/** Every digit that was entered, with a true minus sign before a negative number. */
function plain(value: number | undefined): string {
  return value === undefined ? '' : String(value).replace(/^-/, '−')
}

/** A name that no case has yet. */
export function freeName(cases: readonly { body: { name: string } }[], wanted: string): string {
  const taken = new Set(cases.map((row) => row.body.name))
  if (!taken.has(wanted)) return wanted
  let number = 2
  while (taken.has(`${wanted} ${number}`)) number += 1
  return `${wanted} ${number}`
}

/** A copy of a case: of the base case one that inherits everything, of another case one with the same differences. */
export function copyOfCase(source: Case, name: string): Case {
  if (!source.isBase) return { ...source, name }
  return {
    name,
    isBase: false,
    note: '',
    flow: null,
    extent: null,
    cellSize: null,
    tolerance: null,
    method: null,
    verify: null,
    overrides: [],
  }
}

/** A base case to start from: the extent around everything drawn, about 100 cells along its longer side. */
export function firstBaseCase(inputs: CaseInputs): Case {
  const spots = [
    ...inputs.boundaries.flatMap((row) => row.body.line),
    ...inputs.walls.flatMap((row) => row.body.line),
    ...inputs.zones.flatMap((row) => row.body.polygon ?? []),
    ...inputs.wells.map((row): [number, number] => [row.body.x, row.body.y]),
  ]
  const xs = spots.map(([x]) => x)
  const ys = spots.map(([, y]) => y)
  const [xMin, xMax, yMin, yMax] =
    spots.length > 0 ? [lowest(xs), highest(xs), lowest(ys), highest(ys)] : [0, 1000, 0, 1000]
  const extent = {
    xMin,
    xMax: xMax > xMin ? xMax : xMin + 1000,
    yMin,
    yMax: yMax > yMin ? yMax : yMin + 1000,
  }
  const longer = Math.max(extent.xMax - extent.xMin, extent.yMax - extent.yMin)
  return {
    name: 'Base case',
    isBase: true,
    note: '',
    flow: inputs.zones.every((row) => row.body.top) ? 'confined' : 'unconfined',
    extent,
    cellSize: { value: roundStep(longer / 100), unit: inputs.project.units.length },
    tolerance: null,
    method: null,
    verify: null,
    overrides: [],
  }
}

function lowest(values: readonly number[]): number {
  return values.reduce((a, b) => Math.min(a, b), Number.POSITIVE_INFINITY)
}

function highest(values: readonly number[]): number {
  return values.reduce((a, b) => Math.max(a, b), Number.NEGATIVE_INFINITY)
}

/** The nearest of 1, 2, 5 times a power of ten from below. */
function roundStep(value: number): number {
  const power = 10 ** Math.floor(Math.log10(value))
  const step = [5, 2, 1].find((one) => one * power <= value * (1 + 1e-12)) ?? 1
  return Number((step * power).toPrecision(1))
}

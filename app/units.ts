/**
 * Quantities. A quantity keeps the number and the unit that a person entered, and is never rewritten;
 * `convert` turns it into any other unit of the same dimension. Factors are to SI (metre, second).
 * Sources: foot, inch and US gallon by definition (NIST SP 811, 2008, appendix B); US survey foot 1200/3937 m
 * (NIST SP 811); imperial gallon 4.54609 l (UK Weights and Measures Act 1985); year of 365.25 days (IAU).
 * Pressure becomes metres of water at 1000 kg/m3 and 9.80665 m/s2 (ISO 80000-4 standard gravity).
 */
export type Dimension =
  | 'length'
  | 'time'
  | 'conductivity'
  | 'transmissivity'
  | 'rate'
  | 'line flux'
  | 'per length'
  | 'leakance'
  | 'pressure'
  | 'none'

const foot = 0.3048
const day = 86_400
const year = 365.25 * day
const waterWeight = 1000 * 9.80665

interface UnitDefinition {
  dimension: Dimension
  /** Multiply by this to get SI. */
  factor: number
  /** As printed. */
  label: string
  /** As typed, besides the name and the label. */
  also?: readonly string[]
}

export const units = {
  m: { dimension: 'length', factor: 1, label: 'm', also: ['metre', 'metres', 'meter', 'meters'] },
  mm: { dimension: 'length', factor: 0.001, label: 'mm' },
  cm: { dimension: 'length', factor: 0.01, label: 'cm' },
  km: { dimension: 'length', factor: 1000, label: 'km' },
  ft: { dimension: 'length', factor: foot, label: 'ft', also: ['foot', 'feet', "'"] },
  ftUS: { dimension: 'length', factor: 1200 / 3937, label: 'ft US', also: ['us ft', 'us survey ft'] },
  in: { dimension: 'length', factor: foot / 12, label: 'in', also: ['inch', 'inches', '"'] },
  s: { dimension: 'time', factor: 1, label: 's' },
  min: { dimension: 'time', factor: 60, label: 'min' },
  h: { dimension: 'time', factor: 3600, label: 'h' },
  d: { dimension: 'time', factor: day, label: 'd', also: ['day', 'days'] },
  a: { dimension: 'time', factor: year, label: 'a', also: ['yr', 'year', 'years'] },
  'm/s': { dimension: 'conductivity', factor: 1, label: 'm/s' },
  'm/d': { dimension: 'conductivity', factor: 1 / day, label: 'm/d', also: ['m/day'] },
  'cm/s': { dimension: 'conductivity', factor: 0.01, label: 'cm/s' },
  'mm/d': { dimension: 'conductivity', factor: 0.001 / day, label: 'mm/d', also: ['mm/day'] },
  'mm/a': { dimension: 'conductivity', factor: 0.001 / year, label: 'mm/a', also: ['mm/yr', 'mm/year'] },
  'in/a': { dimension: 'conductivity', factor: foot / 12 / year, label: 'in/a', also: ['in/yr', 'in/year'] },
  'ft/d': { dimension: 'conductivity', factor: foot / day, label: 'ft/d', also: ['ft/day'] },
  'ft/s': { dimension: 'conductivity', factor: foot, label: 'ft/s' },
  'm2/s': { dimension: 'transmissivity', factor: 1, label: 'm²/s' },
  'm2/d': { dimension: 'transmissivity', factor: 1 / day, label: 'm²/d', also: ['m2/day'] },
  'ft2/d': { dimension: 'transmissivity', factor: foot ** 2 / day, label: 'ft²/d', also: ['ft2/day'] },
  'ft2/s': { dimension: 'transmissivity', factor: foot ** 2, label: 'ft²/s' },
  'm3/s': { dimension: 'rate', factor: 1, label: 'm³/s' },
  'm3/h': { dimension: 'rate', factor: 1 / 3600, label: 'm³/h', also: ['m3/hr'] },
  'm3/d': { dimension: 'rate', factor: 1 / day, label: 'm³/d', also: ['m3/day', 'kl/d'] },
  'l/s': { dimension: 'rate', factor: 0.001, label: 'l/s', also: ['L/s'] },
  'ft3/d': { dimension: 'rate', factor: foot ** 3 / day, label: 'ft³/d', also: ['ft3/day'] },
  'ft3/s': { dimension: 'rate', factor: foot ** 3, label: 'ft³/s', also: ['cfs'] },
  gpm: {
    dimension: 'rate',
    factor: (231 * (foot / 12) ** 3) / 60,
    label: 'US gpm',
    also: ['us gpm', 'gal/min'],
  },
  'imp gpm': { dimension: 'rate', factor: 0.00454609 / 60, label: 'imp gpm', also: ['igpm'] },
  'ML/a': { dimension: 'rate', factor: 1000 / year, label: 'ML/a', also: ['ML/yr'] },
  'm3/d/m': { dimension: 'line flux', factor: 1 / day, label: 'm³/d per m', also: ['m3/d per m', 'm2/d'] },
  'm3/s/m': { dimension: 'line flux', factor: 1, label: 'm³/s per m', also: ['m3/s per m', 'm2/s'] },
  'ft3/d/ft': {
    dimension: 'line flux',
    factor: foot ** 2 / day,
    label: 'ft³/d per ft',
    also: ['ft3/d per ft', 'ft2/d'],
  },
  'ft3/s/ft': {
    dimension: 'line flux',
    factor: foot ** 2,
    label: 'ft³/s per ft',
    also: ['ft3/s per ft', 'ft2/s'],
  },
  '1/m': { dimension: 'per length', factor: 1, label: '1/m' },
  '1/ft': { dimension: 'per length', factor: 1 / foot, label: '1/ft' },
  '1/d': { dimension: 'leakance', factor: 1 / day, label: '1/d' },
  '1/s': { dimension: 'leakance', factor: 1, label: '1/s' },
  kPa: { dimension: 'pressure', factor: 1000 / waterWeight, label: 'kPa' },
  hPa: { dimension: 'pressure', factor: 100 / waterWeight, label: 'hPa', also: ['mbar'] },
  bar: { dimension: 'pressure', factor: 1e5 / waterWeight, label: 'bar' },
  psi: {
    dimension: 'pressure',
    factor: (0.45359237 * 9.80665) / (foot / 12) ** 2 / waterWeight,
    label: 'psi',
  },
  '-': { dimension: 'none', factor: 1, label: '–', also: [''] },
} as const satisfies Record<string, UnitDefinition>

export type UnitName = keyof typeof units

export interface Quantity {
  value: number
  unit: UnitName
}

export interface ProjectUnits {
  length: 'm' | 'ft'
  time: 'd' | 's'
}

/** Unit in which a project shows a dimension. */
export function shownUnit(dimension: Dimension, project: ProjectUnits): UnitName {
  const { length, time } = project
  switch (dimension) {
    case 'length':
      return length
    case 'time':
      return time
    case 'conductivity':
      return `${length}/${time}`
    case 'transmissivity':
      return `${length}2/${time}`
    case 'rate':
      return `${length}3/${time}`
    case 'line flux':
      return length === 'm' ? `m3/${time}/m` : `ft3/${time}/ft`
    case 'per length':
      return `1/${length}`
    case 'leakance':
      return `1/${time}`
    case 'pressure':
      return 'kPa'
    case 'none':
      return '-'
  }
}

export function isUnitName(name: string): name is UnitName {
  return Object.hasOwn(units, name)
}

/** The unit as it is printed: "m³/d". */
export function unitLabel(unit: UnitName): string {
  return units[unit].label
}

export function unitsOf(dimension: Dimension): UnitName[] {
  return (Object.keys(units) as UnitName[]).filter((name) => units[name].dimension === dimension)
}

/**
 * The number of a quantity in another unit of the same dimension; exact when the unit is the entered one.
 * A pressure converts to a length as metres of water. Throws when the dimensions differ.
 */
export function convert(quantity: Quantity, to: UnitName): number {
  if (quantity.unit === to) return quantity.value
  const from = units[quantity.unit]
  const target = units[to]
  const asLength = (dimension: Dimension) => (dimension === 'pressure' ? 'length' : dimension)
  if (asLength(from.dimension) !== asLength(target.dimension)) {
    throw new Error(`${quantity.unit} (${from.dimension}) cannot become ${to} (${target.dimension}).`)
  }
  return (quantity.value * from.factor) / target.factor
}

export type ParsedQuantity = { ok: true; quantity: Quantity } | { ok: false; message: string }

/**
 * Reads what a person typed: "12", "12 ft", "1.5e-4 m/s", "1 200 m³/d". Without a unit the column's unit counts.
 * A decimal comma is taken when it is the only mark; a thousands mark must be a space, so that "1,200" is asked about
 * rather than guessed.
 */
export function parseQuantity(text: string, dimension: Dimension, columnUnit: UnitName): ParsedQuantity {
  const tidy = text.trim().replace(/−/g, '-').replace(/²/g, '2').replace(/³/g, '3')
  const match = tidy.match(/^([+-]?(?:\d[\d\s\u00a0]*(?:[.,]\d*)?|[.,]\d+)(?:[eE][+-]?\d+)?)\s*(.*)$/)
  if (!match)
    return { ok: false, message: tidy === '' ? 'A number is needed.' : `"${text}" is not a number.` }
  const [, digits = '', rest = ''] = match
  const compact = digits.replace(/[\s\u00a0]/g, '')
  if (/^[+-]?\d{1,3},\d{3}$/.test(compact)) {
    return {
      ok: false,
      message: `"${compact}" may mean ${compact.replace(',', '')} or ${compact.replace(',', '.')}: write one of them.`,
    }
  }
  const value = Number(compact.replace(',', '.'))
  if (!Number.isFinite(value)) return { ok: false, message: `"${text}" is not a number.` }
  const unit = rest.trim() === '' ? columnUnit : findUnit(rest.trim(), dimension)
  if (!unit) {
    const allowed = unitsOf(dimension).map(unitLabel).join(', ')
    return { ok: false, message: `"${rest.trim()}" is not a unit of this column (${allowed}).` }
  }
  return { ok: true, quantity: { value, unit } }
}

function findUnit(typed: string, dimension: Dimension): UnitName | undefined {
  const wanted = typed.toLowerCase().replace(/\s+/g, ' ')
  return unitsOf(dimension).find((name) => {
    const definition: UnitDefinition = units[name]
    const label = definition.label.replace(/²/g, '2').replace(/³/g, '3')
    return [name, label, ...(definition.also ?? [])].some((word) => word.toLowerCase() === wanted)
  })
}

/**
 * A number for reading: `decimals` fixed, thin-space thousands, a true minus sign; "–" for nothing.
 * Without `decimals`, four significant figures, with a power of ten beyond 1e6 or below 1e-3.
 */
export function formatNumber(value: number | null | undefined, decimals?: number): string {
  if (value === null || value === undefined || !Number.isFinite(value)) return '–'
  const sign = value < 0 ? '−' : ''
  const size = Math.abs(value)
  if (decimals !== undefined) {
    const fixed = size.toFixed(decimals)
    return (Number(fixed) === 0 ? '' : sign) + groupThousands(fixed)
  }
  if (size === 0) return '0'
  if (size >= 1e6 || size < 1e-3) {
    const [mantissa = '', exponent = '0'] = size.toExponential(3).split('e')
    return `${sign}${Number(mantissa)}·10${superscript(Number(exponent))}`
  }
  return sign + groupThousands(String(Number(size.toPrecision(4))))
}

/** As `formatNumber`, with a plus sign before what is above zero as shown: +0.12, −0.12, 0.00. */
export function formatSigned(value: number | null | undefined, decimals?: number): string {
  const text = formatNumber(value, decimals)
  return typeof value === 'number' && value > 0 && /[1-9]/.test(text) ? `+${text}` : text
}

function groupThousands(text: string): string {
  const [whole = '', fraction] = text.split('.')
  const grouped = whole.length > 4 ? whole.replace(/\B(?=(\d{3})+$)/g, '\u202f') : whole
  return fraction === undefined ? grouped : `${grouped}.${fraction}`
}

function superscript(exponent: number): string {
  const digits = '⁰¹²³⁴⁵⁶⁷⁸⁹'
  return [...String(exponent)].map((c) => (c === '-' ? '⁻' : (digits[Number(c)] ?? ''))).join('')
}

/** A quantity in a unit of choice, with its label: "14.0 m/d". */
export function formatQuantity(
  quantity: Quantity,
  unit: UnitName = quantity.unit,
  decimals?: number,
): string {
  const label = unit === '-' ? '' : ` ${unitLabel(unit)}`
  return formatNumber(convert(quantity, unit), decimals) + label
}

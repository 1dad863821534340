import { convert, isUnitName, type UnitName, unitLabel } from '~/units'
import { type ReadingStatus, readStatus } from './reading'

export const decimalMarks = ['point', 'comma'] as const
export type DecimalMark = (typeof decimalMarks)[number]

/** Groups of three digits are set apart by the other mark, a space or an apostrophe, never by the decimal mark. */
const numbers: Record<DecimalMark, RegExp> = {
  point: /^[+-]?(?:\d{1,3}(?:[, '\u00a0\u202f]\d{3})+|\d+)?(?:\.\d*)?(?:[eE][+-]?\d{1,3})?$/,
  comma: /^[+-]?(?:\d{1,3}(?:[. '\u00a0\u202f]\d{3})+|\d+)?(?:,\d*)?(?:[eE][+-]?\d{1,3})?$/,
}
const groupMarks: Record<DecimalMark, RegExp> = { point: /[, '\u00a0\u202f]/g, comma: /[. '\u00a0\u202f]/g }

/** The number that a text is under one decimal mark; null when it is none. */
export function readNumber(text: string, mark: DecimalMark): number | null {
  const tidy = text.trim().replace(/^[−–]/, '-')
  if (!/\d/.test(tidy) || !numbers[mark].test(tidy)) return null
  const value = Number(tidy.replace(groupMarks[mark], '').replace(',', '.'))
  return Number.isFinite(value) ? value : null
}

/** How the decimal mark shows itself over a whole file. */
export interface DecimalProof {
  /** Values that only a decimal point explains, such as 12.5. */
  point: number
  /** Values that only a decimal comma explains, such as 12,5. */
  comma: number
  /** Values such as 1,234, which both explain, differently. */
  either: number
  /** How many of those are written with a comma. */
  eitherWithComma: number
}

export function noDecimalProof(): DecimalProof {
  return { point: 0, comma: 0, either: 0, eitherWithComma: 0 }
}

/** Counts one value into the proof. */
export function weighDecimal(proof: DecimalProof, text: string): void {
  const body = splitUnit(splitOperator(text).rest).number
  const asPoint = readNumber(body, 'point')
  const asComma = readNumber(body, 'comma')
  if (asPoint === asComma) return
  if (asComma === null) proof.point++
  else if (asPoint === null) proof.comma++
  else {
    proof.either++
    if (body.includes(',')) proof.eitherWithComma++
  }
}

/**
 * The decimal mark that a file proves. Three digits after a point (12.345) are millimetres, as readings have them; three
 * digits after a comma, with nothing else to go by, are a question: null.
 */
export function provenDecimal(proof: DecimalProof): DecimalMark | null {
  if (proof.point > 0 || proof.comma > 0) return proof.point >= proof.comma ? 'point' : 'comma'
  return proof.eitherWithComma > 0 ? null : 'point'
}

function splitOperator(text: string): { operator: '<' | '>' | null; rest: string } {
  const match = text.trim().match(/^([<>])\s*(.*)$/s)
  if (!match) return { operator: null, rest: text.trim() }
  return { operator: match[1] as '<' | '>', rest: match[2] ?? '' }
}

/** "12.30 m" as a number and the unit behind it; no unit when none stands there. */
function splitUnit(text: string): { number: string; unit: string } {
  const match = text.match(/^(.*?\d[.,]?)\s*([a-zA-Z"']+)$/s)
  return match ? { number: match[1] ?? '', unit: match[2] ?? '' } : { number: text, unit: '' }
}

/** Numbers by which loggers and data bases say that there is no reading. */
const missingMarks = [-999, -9999, -99_999, -999_999, -999.9, -999.99, -9999.9, -9999.99]

export type ReadValue =
  | { ok: true; value: number | null; operator: '<' | '>' | null; status: ReadingStatus | null }
  | { ok: false; reason: string }

/**
 * Reads the cell of a value: a number, "<12.3", a number with its unit, or a status word such as "dry".
 * `value` comes back in metres (a pressure as metres of water), converted once from the entered number.
 */
export function readValue(text: string, mark: DecimalMark, unit: UnitName): ReadValue {
  const trimmed = text.trim()
  if (trimmed === '') return { ok: false, reason: 'There is no value.' }
  const status = readStatus(trimmed)
  if (status) return { ok: true, value: null, operator: null, status }
  const { operator, rest } = splitOperator(trimmed)
  const { number, unit: written } = splitUnit(rest)
  const entered = readNumber(number, mark)
  if (entered === null)
    return { ok: false, reason: `"${shorten(trimmed)}" is neither a number nor a status.` }
  if (written !== '' && written !== unit && written !== unitLabel(unit)) {
    return {
      ok: false,
      reason: isUnitName(written)
        ? `"${shorten(trimmed)}" is in ${unitLabel(written)}, but the column was chosen as ${unitLabel(unit)}.`
        : `"${shorten(trimmed)}" is neither a number nor a status.`,
    }
  }
  if (missingMarks.includes(entered)) {
    return { ok: false, reason: `${entered} is a usual mark for a missing reading, not a measurement.` }
  }
  const value = convert({ value: entered, unit }, 'm')
  if (Math.abs(value) > 12_000) {
    return {
      ok: false,
      reason: `${shorten(trimmed)} ${unitLabel(unit)} is beyond any level on Earth: check the unit.`,
    }
  }
  return { ok: true, value, operator, status: null }
}

export function shorten(text: string): string {
  return text.length > 40 ? `${text.slice(0, 39)}…` : text
}
